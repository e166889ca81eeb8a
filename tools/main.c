/* main.c: the raddle program: a table of verbs, and a parent process that outlives a crash.
 * Files may come from anywhere, and the libraries that read them (HDF5, assimp) have crashed on broken ones before. So
 * a verb runs in a child process; if that dies of a signal, the parent says so in one line, removes the unfinished
 * output file, and ends with the exit code for work that could not be finished. */
#define _DEFAULT_SOURCE /* MAP_ANONYMOUS */
#include <signal.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mman.h>
#include <sys/wait.h>
#include <unistd.h>

#include "cli.h"
#include "verbs.h"

typedef struct verb {
    const char *name, *summary;
    int (*run)(int argc, char **argv);
    bool guarded; /* reads files: runs in a child process */
} verb;

static const verb verbs[] = {
#ifdef RADDLE_DEMO
    {"demo", "play the demo: a fringed cloth over a turning body", verb_demo, false},
#endif
#ifdef RADDLE_IMPORT
    {"import", "turn a mesh file into a shot of one pose", verb_import, true},
#endif
    {"info", "say what a shot holds", verb_info, true},
    {"resolve", "turn start and proposed positions into collision-free delivered ones", verb_resolve, true},
    {"check", "look for tangles and crossings, independently of the resolver", verb_check, true},
    {"replay", "step recorded frames again and compare the bits", verb_replay, true},
    {"reduce", "find the smallest scene that still shows a failure", verb_reduce, true},
    {"export", "write frames of a shot as OBJ or PLY files", verb_export, true},
};

enum { VERBS = sizeof verbs / sizeof verbs[0] };

/* The name of the file being written, where parent and child both see it. */
static struct pending {
    char path[4200];
} * pending;

/* Set in the parent only, so that its signal handler can pass a signal on. */
static volatile pid_t child_id;

void cli_pending(const char *path)
{
    if (pending == NULL)
        return;
    if (path != NULL && strlen(path) < sizeof pending->path)
        strcpy(pending->path, path);
    else
        pending->path[0] = '\0';
}

static void print_usage(FILE *out)
{
    fprintf(out, "usage: raddle VERB [ARGUMENTS]\n\n");
    for (size_t i = 0; i < VERBS; i++)
        fprintf(out, "  %-10s %s\n", verbs[i].name, verbs[i].summary);
    fprintf(out, "\nraddle VERB --help says more; raddle --version names the version.\n");
}

/* Everything was said: a standard output that is full or closed is the last thing that can go wrong. */
static int finish(int code)
{
    cli_progress_end();
    if (fflush(stdout) != 0 || ferror(stdout)) {
        cli_error("", "standard output cannot be written");
        code = code == CLI_DONE || code == CLI_FINDINGS ? CLI_NOT_FINISHED : code;
    }
    fflush(stderr);
    return code;
}

/* Ctrl-C in a terminal reaches both processes; what another process sent reaches this one alone, and is passed on. */
static void pass_on(int number, siginfo_t *info, void *context)
{
    (void)context;
    if (child_id > 0 && info->si_code <= 0)
        kill(child_id, number);
}

static void wait_quietly(void)
{
    static const int numbers[] = {SIGINT, SIGTERM, SIGHUP};
    struct sigaction action;
    memset(&action, 0, sizeof action);
    sigemptyset(&action.sa_mask);
    action.sa_sigaction = pass_on;
    action.sa_flags = SA_SIGINFO;
    for (size_t i = 0; i < sizeof numbers / sizeof numbers[0]; i++)
        sigaction(numbers[i], &action, NULL);
}

static int report_death(const char *name, int signal_number)
{
    if (pending != NULL && pending->path[0] != '\0')
        unlink(pending->path);
    if (signal_number == SIGINT || signal_number == SIGTERM || signal_number == SIGHUP)
        return CLI_INTERRUPTED;
    if (signal_number == SIGPROF) {
        cli_error(name, "the shot takes too long to open: a broken file can do that");
        return CLI_NOT_FINISHED;
    }
    cli_error(name, "the work ended by signal %d (%s); a broken input file can do that", signal_number,
              strsignal(signal_number));
    return CLI_NOT_FINISHED;
}

static int run_guarded(const verb *chosen, int argc, char **argv)
{
    void *shared = mmap(NULL, sizeof *pending, PROT_READ | PROT_WRITE, MAP_SHARED | MAP_ANONYMOUS, -1, 0);
    pending = shared == MAP_FAILED ? NULL : shared;
    fflush(NULL);
    sigset_t block, before;
    sigemptyset(&block);
    sigaddset(&block, SIGTERM);
    sigaddset(&block, SIGHUP);
    sigaddset(&block, SIGINT);
    sigprocmask(SIG_BLOCK, &block, &before);
    pid_t child = fork();
    if (child <= 0) {
        if (child == 0)
            cli_catch_interrupts();
        sigprocmask(SIG_SETMASK, &before, NULL);
        int code = finish(chosen->run(argc, argv));
        if (child == 0)
            _exit(code); /* no exit handlers: HDF5's speaks up after a file that it could not open */
        return code;     /* no second process to be had: the work was done in this one */
    }
    child_id = child;
    wait_quietly();
    sigprocmask(SIG_SETMASK, &before, NULL);
    int state = 0;
    while (waitpid(child, &state, 0) < 0)
        continue;
    return WIFEXITED(state) ? WEXITSTATUS(state) : report_death(chosen->name, WTERMSIG(state));
}

int main(int argc, char **argv)
{
    signal(SIGPIPE, SIG_IGN);
    if (argc < 2) {
        print_usage(stderr);
        return CLI_BAD_INPUT;
    }
    if (strcmp(argv[1], "--help") == 0) {
        print_usage(stdout);
        return finish(CLI_DONE);
    }
    if (strcmp(argv[1], "--version") == 0) {
        return finish(print_version());
    }
    for (size_t i = 0; i < VERBS; i++) {
        if (strcmp(argv[1], verbs[i].name) != 0)
            continue;
        if (verbs[i].guarded)
            return run_guarded(&verbs[i], argc - 1, argv + 1);
        return finish(verbs[i].run(argc - 1, argv + 1));
    }
    cli_error("", "unknown verb %s (see raddle --help)", cli_clean(argv[1]));
    return CLI_BAD_INPUT;
}
