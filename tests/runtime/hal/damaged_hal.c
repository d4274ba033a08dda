/* Plug-ins that are wrong in one way each, chosen by DAMAGE when this is compiled. */
#include <stdio.h>
#include <string.h>

#include "runtime/hal/pastern_hal.h"

#define NO_ENTRY 1
#define SERVES_NOTHING 2
#define WRONG_VERSION 3
#define WRONG_SIZE 4
#define NO_NAME 5
#define NO_OPEN 6
#define NO_CLOSE 7
#define NO_READ 8
#define NO_WRITE 9
#define NO_WORDS 10
#define OPEN_REFUSED 11
#define OPEN_SILENT 12
#define WRONG_JOINTS 13
#define BAD_STATE 14

static int state;

static void* opened(const pastern_hal_config* config, char* error, size_t capacity) {
  (void)config;
  if (DAMAGE == OPEN_REFUSED) {
    snprintf(error, capacity, "bus 3:\n\tno drive answers");
    return NULL;
  }
  if (DAMAGE == OPEN_SILENT) {
    memset(error, 'x', capacity); /* no ending zero */
    return NULL;
  }
  return &state;
}
static void closed(void* handle) { (void)handle; }
static int frame_read(void* handle, pastern_hal_frame* frame) {
  (void)handle;
  frame->joint_count = 33;
  frame->counter = 1;
  return PASTERN_HAL_OK;
}
static int written(void* handle, const pastern_hal_command* command) {
  (void)handle;
  (void)command;
  return 77; /* not a value of the contract */
}
static const char* words(void* handle) {
  (void)handle;
  return DAMAGE == BAD_STATE ? "two\nlines" : NULL;
}
static int saved(void* handle, void* buffer, size_t capacity, size_t* length) {
  (void)handle;
  (void)buffer;
  *length = capacity + 1; /* never enough */
  return PASTERN_HAL_FAILED;
}

static const pastern_hal kTable = {DAMAGE == WRONG_VERSION ? PASTERN_HAL_VERSION + 1 : PASTERN_HAL_VERSION,
                                   DAMAGE == WRONG_SIZE ? 8 : sizeof(pastern_hal),
                                   DAMAGE == NO_NAME ? NULL : "damaged",
                                   0,
                                   DAMAGE == NO_OPEN ? NULL : opened,
                                   DAMAGE == NO_CLOSE ? NULL : closed,
                                   DAMAGE == NO_READ ? NULL : frame_read,
                                   DAMAGE == NO_WRITE ? NULL : written,
                                   DAMAGE == NO_WORDS ? NULL : words,
                                   DAMAGE == BAD_STATE ? saved : NULL,
                                   NULL,
                                   NULL,
                                   NULL};

#if DAMAGE == NO_ENTRY
const pastern_hal* another_entry(uint32_t version);
const pastern_hal* another_entry(uint32_t version) {
#else
const pastern_hal* pastern_hal_entry(uint32_t version) {
#endif
  return version == PASTERN_HAL_VERSION && DAMAGE != SERVES_NOTHING ? &kTable : NULL;
}
