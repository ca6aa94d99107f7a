#include "base/threads.h"

#include "base/memory.h"

#include <pthread.h>
#include <signal.h>
#include <unistd.h>

/* What the threads share, under the lock. */
typedef struct shared_work {
    pthread_mutex_t lock;
    bali_task task;
    void *context;
    size_t next;   /* the lowest task that nobody has begun */
    size_t end;    /* tasks from here on are not begun: n_tasks, or the lowest failed one */
    bal_status status;
    bal_error error; /* of task end, once status is not BAL_OK */
} shared_work;

/* Takes the next task; false when there is none left to begin. */
static bool begin(shared_work *pool, size_t *task) {
    (void)pthread_mutex_lock(&pool->lock);
    bool any = pool->next < pool->end;
    if (any) *task = pool->next++;
    (void)pthread_mutex_unlock(&pool->lock);
    return any;
}

/* Tasks are begun in order, so every one below a failed one is at least on its way, and may still fail itself. */
static void fail(shared_work *pool, size_t task, bal_status status, const bal_error *error) {
    (void)pthread_mutex_lock(&pool->lock);
    if (task < pool->end) {
        pool->end = task;
        pool->status = status;
        pool->error = *error;
    }
    (void)pthread_mutex_unlock(&pool->lock);
}

static void *work(void *context) {
    shared_work *pool = context;
    for (size_t task; begin(pool, &task);) {
        bal_error error = {0};
        bal_status status = pool->task(pool->context, task, &error);
        if (status != BAL_OK) fail(pool, task, status, &error);
    }
    return NULL;
}

/* Starts up to n threads; fewer when the system gives no more. An interrupt is for the caller's thread, which knows what to
 * clean up. */
static size_t start(pthread_t *threads, size_t n, shared_work *pool) {
    sigset_t held, before;
    (void)sigemptyset(&held);
    (void)sigaddset(&held, SIGINT);
    (void)sigaddset(&held, SIGTERM);
    (void)sigaddset(&held, SIGHUP);
    (void)pthread_sigmask(SIG_BLOCK, &held, &before);
    size_t running = 0;
    while (running < n && pthread_create(&threads[running], NULL, work, pool) == 0) running++;
    (void)pthread_sigmask(SIG_SETMASK, &before, NULL);
    return running;
}

bal_status bali_run_tasks(bali_task task, void *context, size_t n_tasks, unsigned n_threads, unsigned *started, bal_error *err) {
    shared_work pool = {.lock = PTHREAD_MUTEX_INITIALIZER, .task = task, .context = context, .end = n_tasks};
    size_t wanted = n_threads < n_tasks ? n_threads : n_tasks;
    size_t others = wanted > 1 ? wanted - 1 : 0;
    pthread_t *threads = others ? bali_allocate(others, sizeof *threads) : NULL;
    if (others && !threads) return bali_out_of_memory(err);
    size_t running = start(threads, others, &pool);
    if (started) *started = (unsigned)running + 1;
    (void)work(&pool);
    for (size_t i = 0; i < running; i++) (void)pthread_join(threads[i], NULL);
    bali_free(threads);
    (void)pthread_mutex_destroy(&pool.lock);
    if (pool.status != BAL_OK && err && err->status == BAL_OK) *err = pool.error;
    return pool.status;
}

unsigned bali_processors(void) {
    long online = sysconf(_SC_NPROCESSORS_ONLN);
    return online > 0 ? (unsigned)online : 1;
}
