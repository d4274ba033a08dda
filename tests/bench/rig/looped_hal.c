/* A HAL plug-in for benches: a trot of made-up numbers, one gait period long, played round and round from
 * memory. Nothing answers to torque. It notes when each read and write began and ended, and keeps the last
 * commands in a ring that other processes may map. Options: "stance=Q0,Q1,..." joint angles about which the
 * legs swing; "swing=RAD" how far (default 0.12); "speed=RAD_S" a constant joint speed reported instead of
 * the swing's own; "ring=PATH" file of the command ring. */
#include "tests/bench/rig/looped_hal.h"

#include <fcntl.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mman.h>
#include <time.h>
#include <unistd.h>

#include "runtime/hal/pastern_hal.h"

#define FRAMES 400 /* 2.5 Hz at 1 kHz */

typedef struct looped {
  pastern_hal_frame frames[FRAMES];
  uint64_t counter;
  looped_ring* ring;
  looped_ring own_ring;
  int mapped;
} looped;

looped_times looped_last;
looped_hook looped_on_read;

static int64_t now_ns(void) {
  struct timespec now;
  clock_gettime(CLOCK_MONOTONIC, &now);
  return (int64_t)now.tv_sec * 1000000000 + now.tv_nsec;
}

/* Text after "key=", or null. */
static const char* option(const char* options, const char* key) {
  const size_t length = strlen(key);
  while (options != NULL && *options != '\0') {
    if (strncmp(options, key, length) == 0 && options[length] == '=') return options + length + 1;
    options = strchr(options, ';');
    if (options != NULL) ++options;
  }
  return NULL;
}

static double number(const char* options, const char* key, double otherwise) {
  const char* text = option(options, key);
  return text == NULL ? otherwise : strtod(text, NULL);
}

static void fill_frame(pastern_hal_frame* frame, int k, uint32_t joints, const double* stance, double swing,
                       const char* options) {
  const double turn = 6.283185307179586;
  const double phase = turn * k / FRAMES;
  const char* constant = option(options, "speed");
  uint32_t j;
  memset(frame, 0, sizeof(*frame));
  frame->joint_count = joints;
  for (j = 0; j < joints; ++j) {
    const double at = phase + 0.7 * j;
    frame->angle_rad[j] = stance[j] + swing * sin(at);
    frame->speed_rad_s[j] = constant != NULL ? strtod(constant, NULL) : swing * turn * 2.5 * cos(at);
    frame->torque_nm[j] = 6.0 * sin(at + 0.4) + 2.0;
    frame->winding_c[j] = 38.0 + 0.01 * sin(at);
    frame->housing_c[j] = 31.0 + 0.01 * cos(at);
  }
  frame->rate_rad_s[0] = 0.3 * sin(phase);
  frame->rate_rad_s[1] = 0.4 * cos(phase);
  frame->rate_rad_s[2] = 0.05 * sin(2.0 * phase);
  frame->acceleration_m_s2[0] = 0.6 * cos(phase);
  frame->acceleration_m_s2[1] = 0.5 * sin(phase);
  frame->acceleration_m_s2[2] = 9.80665 + 1.5 * sin(2.0 * phase);
  frame->pack_voltage_v = 0; /* set in open: it depends on the robot */
  frame->pack_current_a = 6.0 + sin(phase);
}

static looped_ring* map_ring(const char* path) {
  void* at = MAP_FAILED;
  const int file = open(path, O_RDWR | O_CREAT, 0600);
  if (file >= 0 && ftruncate(file, sizeof(looped_ring)) == 0) {
    at = mmap(NULL, sizeof(looped_ring), PROT_READ | PROT_WRITE, MAP_SHARED, file, 0);
  }
  if (file >= 0) close(file);
  return at == MAP_FAILED ? NULL : at;
}

static void looped_close(void* handle) {
  looped* self = handle;
  if (self->mapped) munmap(self->ring, sizeof(looped_ring));
  free(self);
}

static void* looped_open(const pastern_hal_config* config, char* error, size_t capacity) {
  const char* stance = option(config->options, "stance");
  const char* ring = option(config->options, "ring");
  double angle[PASTERN_HAL_MAX_JOINTS];
  char path[512];
  looped* self;
  uint32_t j;
  int k;
  for (j = 0; j < config->joint_count; ++j) {
    char* rest = NULL;
    angle[j] = stance == NULL ? 0.0 : strtod(stance, &rest);
    if (stance == NULL || rest == stance) {
      snprintf(error, capacity, "options: found \"%s\", expected stance= with %u angles", config->options,
               config->joint_count);
      return NULL;
    }
    stance = *rest == ',' ? rest + 1 : rest;
  }
  self = calloc(1, sizeof(*self));
  if (self == NULL) return NULL;
  for (k = 0; k < FRAMES; ++k) {
    fill_frame(&self->frames[k], k, config->joint_count, angle, number(config->options, "swing", 0.12),
               config->options);
    self->frames[k].pack_voltage_v = number(config->options, "voltage", 48.0) + 0.02 * sin(0.1 * k);
  }
  self->ring = &self->own_ring;
  if (ring != NULL) {
    snprintf(path, sizeof(path), "%.*s", (int)strcspn(ring, ";"), ring);
    self->ring = map_ring(path);
    self->mapped = self->ring != NULL;
    if (!self->mapped) {
      snprintf(error, capacity, "cannot map %s", path);
      free(self);
      return NULL;
    }
  }
  return self;
}

/* Not static, nor is looped_write: callgrind is told their names. */
int looped_read(void* handle, pastern_hal_frame* frame) {
  looped* self = handle;
  if (looped_on_read != NULL) looped_on_read();
  looped_last.read_began = now_ns();
  *frame = self->frames[self->counter % FRAMES];
  frame->struct_size = sizeof(*frame);
  frame->counter = ++self->counter;
  frame->time_ns = looped_last.read_began;
  looped_last.read_ended = now_ns();
  return PASTERN_HAL_OK;
}

int looped_write(void* handle, const pastern_hal_command* command) {
  looped* self = handle;
  looped_ring* ring = self->ring;
  looped_entry* entry = &ring->entry[ring->written % LOOPED_RING];
  looped_last.write_began = now_ns();
  entry->time_ns = looped_last.write_began;
  entry->torque_on = command->torque_on;
  memcpy(entry->torque_nm, command->torque_nm, sizeof(entry->torque_nm));
  __atomic_store_n(&ring->written, ring->written + 1, __ATOMIC_RELEASE);
  looped_last.write_ended = now_ns();
  return PASTERN_HAL_OK;
}

static const char* looped_words(void* handle) {
  (void)handle;
  return "";
}

static const pastern_hal kTable = {
    PASTERN_HAL_VERSION, sizeof(pastern_hal), "looped", 0,    looped_open, looped_close, looped_read,
    looped_write,        looped_words,        NULL,     NULL, NULL,        NULL};

const pastern_hal* pastern_hal_entry(uint32_t version) {
  return version == PASTERN_HAL_VERSION ? &kTable : NULL;
}
