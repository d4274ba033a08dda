/* What the looped plug-in lets a bench see. Plain C. */
#ifndef PASTERN_BENCH_LOOPED_HAL_H
#define PASTERN_BENCH_LOOPED_HAL_H

#include <stdint.h>

#define LOOPED_RING 4096

/* CLOCK_MONOTONIC, ns, of the last tick. */
typedef struct looped_times {
  int64_t read_began;
  int64_t read_ended;
  int64_t write_began;
  int64_t write_ended;
} looped_times;

typedef struct looped_entry {
  int64_t time_ns; /* when the write began */
  uint8_t torque_on;
  double torque_nm[32];
} looped_entry;

/* Called at the beginning of each read, in the cycle's thread, when not null: symbol "looped_on_read". */
typedef void (*looped_hook)(void);

/* The last commands; `written` rises by one with each and is stored last. */
typedef struct looped_ring {
  uint64_t written;
  looped_entry entry[LOOPED_RING];
} looped_ring;

#endif
