/* base/workers.h: the parallel loop: the host's, or our own threads. No result may depend on the worker number. */
#ifndef RDLI_WORKERS_H
#define RDLI_WORKERS_H

#include "base/memory.h"

typedef struct rdli_workers rdli_workers;

rdl_status rdli_workers_create(rdli_memory *memory, const rdl_host *host, rdli_workers **workers);
void rdli_workers_destroy(rdli_memory *memory, rdli_workers *workers);
unsigned rdli_workers_count(const rdli_workers *workers);
/* task(data, i, worker) once for each i in [0, count); returns when all are done. Loops of one index or one worker run
 * in the caller's thread. Not reentrant. */
void rdli_parallel_for(rdli_workers *workers, size_t count, rdl_task *task, void *data);
/* The host's cancel callback; false without one. */
bool rdli_cancelled(const rdli_workers *workers);

#endif
