/* raddle/host.h: what the host lends to an object: memory, threads, cancel, diagnostics.
 * Usable from C17 and C++17. */
#ifndef RADDLE_HOST_H
#define RADDLE_HOST_H

#include <stddef.h>

#include "status.h"

#ifdef __cplusplus
extern "C" {
#endif

/* Called once for each index in [0, count); worker < threads, and no two calls with one worker number overlap. */
typedef void rdl_task(void *data, size_t index, unsigned worker);

/* All members may be zero or NULL: then the library's own defaults serve.
 * size: sizeof(rdl_host), so that later versions may append members.
 * threads: upper bound of workers, 0 = number of online processors, at most RDL_THREADS_MAX. With 1 everything
 *   runs in the caller's thread. Results never depend on it.
 * user: handed to every callback.
 * allocate: returns memory for `bytes` (> 0) aligned to 64 bytes, or NULL. release gets the same byte count back.
 *   Both or neither must be given.
 * parallel_for: runs task(data, i, worker) for all i in [0, count) and returns when all are done. NULL: own threads.
 * cancel: polled during long work; non-zero ends the call with RDL_CANCELLED.
 * diagnose: told of each raised error (condition text, source file, line); for logs and break points. */
#define RDL_THREADS_MAX 256u
typedef struct rdl_host {
    size_t size;
    unsigned threads;
    void *user;
    void *(*allocate)(void *user, size_t bytes);
    void (*release)(void *user, void *memory, size_t bytes);
    void (*parallel_for)(void *user, size_t count, rdl_task *task, void *data);
    int (*cancel)(void *user);
    void (*diagnose)(void *user, rdl_status status, const char *condition, const char *file, int line);
} rdl_host;

#ifdef __cplusplus
}
#endif
#endif
