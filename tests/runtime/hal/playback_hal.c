/* A HAL plug-in that plays back recorded frames from a text file: nothing is simulated and nothing answers to
 * torque. Options: "frames=PATH;commands=PATH". A line of the first file is one of frame COUNTER TIME_NS
 * angle... speed... torque... winding... (joint_count each)  rate xyz  acceleration xyz pack_v pack_a
 * emergency_stop nothing        (no new frame) broken WORDS   (the bus fails) Every command is a line of the
 * second file: tick, torque_on, torques. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "runtime/hal/pastern_hal.h"

typedef struct playback {
  FILE* frames;
  FILE* commands;
  uint32_t joint_count;
  char words[200];
} playback;

/* Copies the value of `key` in "key=value;key=value" into `value`; 0 when it is not there. */
static int option(const char* options, const char* key, char* value, size_t capacity) {
  const size_t length = strlen(key);
  const char* at = options;
  while (at != NULL && *at != '\0') {
    if (strncmp(at, key, length) == 0 && at[length] == '=') {
      const char* from = at + length + 1;
      const size_t size = strcspn(from, ";");
      if (size >= capacity) return 0;
      memcpy(value, from, size);
      value[size] = '\0';
      return 1;
    }
    at = strchr(at, ';');
    if (at != NULL) ++at;
  }
  return 0;
}

static void playback_close(void* handle) {
  playback* self = handle;
  if (self->frames != NULL) fclose(self->frames);
  if (self->commands != NULL) fclose(self->commands);
  free(self);
}

static void* playback_open(const pastern_hal_config* config, char* error, size_t capacity) {
  char frames[512];
  char commands[512];
  playback* self;
  if (!option(config->options, "frames", frames, sizeof(frames)) ||
      !option(config->options, "commands", commands, sizeof(commands))) {
    snprintf(error, capacity, "options: found \"%s\", expected frames=PATH;commands=PATH", config->options);
    return NULL;
  }
  self = calloc(1, sizeof(*self));
  if (self == NULL) return NULL;
  self->joint_count = config->joint_count;
  self->frames = fopen(frames, "r");
  self->commands = fopen(commands, "w");
  if (self->frames == NULL || self->commands == NULL) {
    snprintf(error, capacity, "cannot open %s or %s", frames, commands);
    playback_close(self);
    return NULL;
  }
  return self;
}

static int numbers(FILE* file, double* values, uint32_t count) {
  uint32_t i;
  for (i = 0; i < count; ++i) {
    if (fscanf(file, "%lf", &values[i]) != 1) return 0;
  }
  return 1;
}

static int read_frame(playback* self, pastern_hal_frame* frame) {
  unsigned long long counter;
  long long time_ns;
  double tail[3];
  const uint32_t n = self->joint_count;
  if (fscanf(self->frames, "%llu %lld", &counter, &time_ns) != 2 ||
      !numbers(self->frames, frame->angle_rad, n) || !numbers(self->frames, frame->speed_rad_s, n) ||
      !numbers(self->frames, frame->torque_nm, n) || !numbers(self->frames, frame->winding_c, n) ||
      !numbers(self->frames, frame->rate_rad_s, 3) || !numbers(self->frames, frame->acceleration_m_s2, 3) ||
      !numbers(self->frames, tail, 3)) {
    snprintf(self->words, sizeof(self->words), "the recording is damaged");
    return PASTERN_HAL_FAILED;
  }
  frame->joint_count = n;
  frame->counter = counter;
  frame->time_ns = time_ns;
  frame->pack_voltage_v = tail[0];
  frame->pack_current_a = tail[1];
  frame->emergency_stop = tail[2] != 0.0;
  frame->has_attitude = 0;
  frame->has_position = 0;
  return PASTERN_HAL_OK;
}

static int playback_read(void* handle, pastern_hal_frame* frame) {
  playback* self = handle;
  char kind[16];
  if (fscanf(self->frames, "%15s", kind) != 1 || strcmp(kind, "nothing") == 0) return PASTERN_HAL_NO_FRAME;
  if (strcmp(kind, "frame") == 0) return read_frame(self, frame);
  if (fscanf(self->frames, " %199[^\n]", self->words) != 1) self->words[0] = '\0';
  return PASTERN_HAL_FAILED;
}

static int playback_write(void* handle, const pastern_hal_command* command) {
  playback* self = handle;
  uint32_t j;
  fprintf(self->commands, "%llu %d", (unsigned long long)command->tick, command->torque_on);
  for (j = 0; j < command->joint_count; ++j) fprintf(self->commands, " %.17g", command->torque_nm[j]);
  fprintf(self->commands, "\n");
  return fflush(self->commands) == 0 ? PASTERN_HAL_OK : PASTERN_HAL_FAILED;
}

static const char* playback_words(void* handle) { return ((playback*)handle)->words; }

static const char* playback_about(void* handle) {
  (void)handle;
  return "frames of a\nrecorded walk";
}

static const pastern_hal kTable = {
    PASTERN_HAL_VERSION, sizeof(pastern_hal), "playback", 0,    playback_open, playback_close, playback_read,
    playback_write,      playback_words,      NULL,       NULL, NULL,          playback_about};

const pastern_hal* pastern_hal_entry(uint32_t version) {
  return version == PASTERN_HAL_VERSION ? &kTable : NULL;
}
