/* The hardware interface of Pastern: a versioned C ABI that a plug-in fills in. One header, used alike by the
 * simulated robot and by a real drive bus. Plain C11, no dependency.
 *
 * Life of a plug-in
 *   dlopen -> pastern_hal_entry(PASTERN_HAL_VERSION) -> open -> { read, write } once a tick -> close.
 *   The table and its strings belong to the plug-in and live until it is closed. A frame belongs to the
 * caller; the plug-in fills it and keeps no pointer to it. A command belongs to the caller and is valid
 * during write only. All calls after open come from one thread at a time (the cycle), never two at once.
 *
 * Timing
 *   read returns the newest frame and must not wait longer than a quarter of the period. write must not wait.
 *   Neither may allocate memory, take a lock that another thread may hold for long, or block on the network.
 *
 * Safety duties of the drives (not of the caller)
 *   Command timeout: when no write has arrived for `drive_timeout_s` (default 0.020 s) the drives damp by
 * themselves and take the torque off 0.5 s later; once off they stay off until a command with torque_on == 0
 * has arrived. This holds when the process is stopped, killed or starved.
 *   Emergency stop: the input acts on the drives directly; the frame only reports it.
 *   `torque_on == 0` means no torque is produced, from the next command period on.
 *
 * Failure
 *   read: PASTERN_HAL_OK new frame; PASTERN_HAL_NO_FRAME nothing new since the last (the frame is left
 * unchanged; the caller's stale watch judges it); PASTERN_HAL_FAILED the bus is broken: the caller trips at
 * once (bus_error) and goes on trying to write torque_on == 0. write: PASTERN_HAL_OK or PASTERN_HAL_FAILED,
 * judged alike. error_text gives one line about the last failure.
 *
 * Units: rad, rad/s, N m, deg C, V, A, m, m/s^2, nanoseconds of CLOCK_MONOTONIC (or simulated time).
 * Frames: body x forward, y left, z up; world x forward along the lane, z up. Attitude: unit quaternion
 * body-to-world, scalar first. Joints: the order of the robot file. Entries from joint_count on are ignored.
 */
#ifndef PASTERN_HAL_H
#define PASTERN_HAL_H

#include <stddef.h>
#include <stdint.h>

#ifdef __cplusplus
extern "C" {
#endif

/* The names of a C interface are those of C. NOLINTBEGIN(readability-identifier-naming) */
#define PASTERN_HAL_VERSION 2u
#define PASTERN_HAL_MAX_JOINTS 32

enum { PASTERN_HAL_OK = 0, PASTERN_HAL_NO_FRAME = 1, PASTERN_HAL_FAILED = 2 };

typedef struct pastern_hal_frame {
  uint32_t struct_size; /* set by the caller to sizeof(pastern_hal_frame) */
  uint32_t joint_count;
  uint64_t counter; /* rises by one with every new frame */
  int64_t time_ns;  /* of sampling; at wall pace, further from now than frame_stale_s: stale */
  double angle_rad[PASTERN_HAL_MAX_JOINTS];
  double speed_rad_s[PASTERN_HAL_MAX_JOINTS];
  double torque_nm[PASTERN_HAL_MAX_JOINTS];
  double winding_c[PASTERN_HAL_MAX_JOINTS];
  double housing_c[PASTERN_HAL_MAX_JOINTS];
  double rate_rad_s[3];
  double acceleration_m_s2[3];
  double attitude_wxyz[4];
  double position_m[3];
  double pack_voltage_v;
  double pack_current_a;
  uint8_t has_attitude;
  uint8_t has_position;
  uint8_t emergency_stop; /* 1: the emergency-stop input is open */
  uint8_t reserved[5];
} pastern_hal_frame;

typedef struct pastern_hal_command {
  uint32_t struct_size;
  uint32_t joint_count;
  uint64_t tick;
  uint8_t torque_on; /* 0: no torque */
  uint8_t reserved[7];
  double torque_nm[PASTERN_HAL_MAX_JOINTS];
} pastern_hal_command;

typedef struct pastern_hal_config {
  uint32_t struct_size;
  uint32_t joint_count;
  const char* const* joint_names; /* in the order of the robot file */
  double period_s;                /* of the cycle */
  double drive_timeout_s;
  const char* robot_file; /* path */
  const char* options;    /* "key=value;key=value", the plug-in's own; never null */
  uint64_t seed;          /* for plug-ins that draw random numbers */
  int stepped;            /* 1: time is simulated and advances by period_s with each write; 0: wall clock */
} pastern_hal_config;

typedef struct pastern_hal {
  uint32_t version;     /* PASTERN_HAL_VERSION that the plug-in was built for */
  uint32_t struct_size; /* sizeof(pastern_hal) */
  const char* name;
  int simulated; /* 1: no real drives behind it */

  /* Returns a handle, or null with one line in error (at most capacity bytes with the ending zero). */
  void* (*open)(const pastern_hal_config* config, char* error, size_t capacity);
  void (*close)(void* handle);
  int (*read)(void* handle, pastern_hal_frame* frame);
  int (*write)(void* handle, const pastern_hal_command* command);
  const char* (*error_text)(void* handle);

  /* Optional (null when absent), simulated robots only. Between orders, never within a tick.
   * save: writes what carries over between walks (heat, charge, wear, clock) and sets *length;
   * PASTERN_HAL_FAILED with *length = bytes needed when capacity is too small. restore: the inverse.
   * carry_back: a person has put the robot back on its start mark, torque off; what is random about that is a
   * pure function of `draw`. */
  int (*save)(void* handle, void* buffer, size_t capacity, size_t* length);
  int (*restore)(void* handle, const void* buffer, size_t length);
  int (*carry_back)(void* handle, uint64_t draw);

  /* Optional (null when absent): one line for the record about what is behind the handle, that its name and
   * the options do not say: serial numbers of drives, firmware; of the simulated robot, its site as it was
   * drawn. Asked once, after open; lives as long as the handle. */
  const char* (*about)(void* handle);
} pastern_hal;

/* The one symbol that a plug-in exports. Returns null when it cannot serve `version`. */
const pastern_hal* pastern_hal_entry(uint32_t version);
typedef const pastern_hal* (*pastern_hal_entry_fn)(uint32_t version);
/* NOLINTEND(readability-identifier-naming) */

#ifdef __cplusplus
}
#endif
#endif
