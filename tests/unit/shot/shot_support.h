/* What the shot tests share: a small scene with all three kinds and every rule, made-up frames, a scratch folder. */
#ifndef SHOT_SUPPORT_H
#define SHOT_SUPPORT_H

#include "raddle/shot.h"

enum { VERTICES = 9, WAYPOINTS_MAX = 3, MEMORY_MAX = 9000 };

/* A strand of 3 vertices, a cloth triangle, a driven body triangle. Static storage. */
const rdl_scene *small_scene(void);

typedef struct made_frame {
    double start[VERTICES][3], proposed[VERTICES][3], delivered[VERTICES][3];
    double waypoint_times[WAYPOINTS_MAX], waypoints[WAYPOINTS_MAX][VERTICES][3];
    unsigned char memory[MEMORY_MAX];
    rdl_shot_frame frame;
} made_frame;

/* Frame k: k % 4 way-points (0 to 3), a memory of (k * 2500) % 9000 bytes, numbers that float32 can hold. */
void make_frame(made_frame *made, unsigned k);
/* Fails the running test when the frame of the file differs from frame k. */
void expect_frame(rdl_shot *shot, size_t index, unsigned k);

/* A path in a scratch folder of this process; the folder is emptied at exit. Static storage, four at a time. */
const char *scratch(const char *name);
/* Writes frames 0 .. count-1 with everything in them. */
void write_shot(const char *path, unsigned count, int host_bits, int deflate);
void copy_file(const char *from, const char *to);
int file_exists(const char *path);
/* The whole file; *bytes is its length. The caller frees it. */
unsigned char *load(const char *path, size_t *bytes);
void store(const char *path, const void *data, size_t bytes);
/* Opening PATH ends with that status and names that offender. */
void expect_open(const char *path, rdl_status status, const char *field, uint64_t index);

#endif
