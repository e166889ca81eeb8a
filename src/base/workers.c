/* base/workers.c: a small pool of POSIX threads that hand out indices by one atomic counter.
 * Why not OpenMP: an engine must not depend on a process-wide runtime that the host may also use with other settings,
 * and two engines in two host threads must not share a pool. */
#include "base/workers.h"

#include <pthread.h>
#include <stdatomic.h>
#include <unistd.h>

typedef struct worker_slot {
    rdli_workers *pool;
    unsigned worker;
} worker_slot;

struct rdli_workers {
    void *user;
    void (*host_loop)(void *user, size_t count, rdl_task *task, void *data);
    int (*cancel)(void *user);
    unsigned count;   /* workers, the caller included */
    unsigned started; /* own threads */
    pthread_t threads[RDL_THREADS_MAX];
    worker_slot slots[RDL_THREADS_MAX];
    pthread_mutex_t lock;
    pthread_cond_t wake, idle;
    uint64_t generation;
    unsigned running;
    bool quit;
    rdl_task *task;
    void *data;
    size_t items;
    _Atomic size_t next;
};

static void drain(rdli_workers *pool, unsigned worker)
{
    for (;;) {
        size_t index = atomic_fetch_add_explicit(&pool->next, 1, memory_order_relaxed);
        if (index >= pool->items)
            return;
        pool->task(pool->data, index, worker);
    }
}

static void *thread_main(void *argument)
{
    const worker_slot *slot = argument;
    rdli_workers *pool = slot->pool;
    uint64_t seen = 0;
    pthread_mutex_lock(&pool->lock);
    for (;;) {
        while (!pool->quit && pool->generation == seen)
            pthread_cond_wait(&pool->wake, &pool->lock);
        if (pool->quit)
            break;
        seen = pool->generation;
        pthread_mutex_unlock(&pool->lock);
        drain(pool, slot->worker);
        pthread_mutex_lock(&pool->lock);
        if (--pool->running == 0)
            pthread_cond_signal(&pool->idle);
    }
    pthread_mutex_unlock(&pool->lock);
    return NULL;
}

static unsigned wanted_threads(const rdl_host *host)
{
    unsigned wanted = host != NULL ? host->threads : 0;
    if (wanted == 0) {
        long online = sysconf(_SC_NPROCESSORS_ONLN);
        wanted = online > 0 ? (unsigned)online : 1;
    }
    return wanted > RDL_THREADS_MAX ? RDL_THREADS_MAX : wanted;
}

rdl_status rdli_workers_create(rdli_memory *memory, const rdl_host *host, rdli_workers **workers)
{
    rdli_workers *pool = rdli_take(memory, 1, sizeof *pool);
    if (pool == NULL)
        return RDL_NO_MEMORY;
    memset(pool, 0, sizeof *pool);
    pool->user = host != NULL ? host->user : NULL;
    pool->host_loop = host != NULL ? host->parallel_for : NULL;
    pool->cancel = host != NULL ? host->cancel : NULL;
    pool->count = wanted_threads(host);
    pthread_mutex_init(&pool->lock, NULL);
    pthread_cond_init(&pool->wake, NULL);
    pthread_cond_init(&pool->idle, NULL);
    while (pool->host_loop == NULL && pool->started + 1 < pool->count) {
        unsigned k = pool->started;
        pool->slots[k].pool = pool;
        pool->slots[k].worker = k + 1;
        /* A system that refuses another thread only makes us slower. */
        if (pthread_create(&pool->threads[k], NULL, thread_main, &pool->slots[k]) != 0)
            break;
        pool->started++;
    }
    if (pool->host_loop == NULL)
        pool->count = pool->started + 1;
    *workers = pool;
    return RDL_OK;
}

void rdli_workers_destroy(rdli_memory *memory, rdli_workers *pool)
{
    if (pool == NULL)
        return;
    pthread_mutex_lock(&pool->lock);
    pool->quit = true;
    pthread_cond_broadcast(&pool->wake);
    pthread_mutex_unlock(&pool->lock);
    for (unsigned k = 0; k < pool->started; k++)
        pthread_join(pool->threads[k], NULL);
    pthread_cond_destroy(&pool->idle);
    pthread_cond_destroy(&pool->wake);
    pthread_mutex_destroy(&pool->lock);
    rdli_give(memory, pool, 1, sizeof *pool);
}

unsigned rdli_workers_count(const rdli_workers *pool)
{
    return pool->count;
}

void rdli_parallel_for(rdli_workers *pool, size_t count, rdl_task *task, void *data)
{
    if (count == 0)
        return;
    if (count == 1 || pool->count == 1) {
        for (size_t i = 0; i < count; i++)
            task(data, i, 0);
        return;
    }
    if (pool->host_loop != NULL) {
        pool->host_loop(pool->user, count, task, data);
        return;
    }
    pthread_mutex_lock(&pool->lock);
    pool->task = task;
    pool->data = data;
    pool->items = count;
    atomic_store_explicit(&pool->next, 0, memory_order_relaxed);
    pool->running = pool->started;
    pool->generation++;
    pthread_cond_broadcast(&pool->wake);
    pthread_mutex_unlock(&pool->lock);
    drain(pool, 0);
    pthread_mutex_lock(&pool->lock);
    while (pool->running != 0)
        pthread_cond_wait(&pool->idle, &pool->lock);
    pthread_mutex_unlock(&pool->lock);
}

bool rdli_cancelled(const rdli_workers *pool)
{
    return pool->cancel != NULL && pool->cancel(pool->user) != 0;
}
