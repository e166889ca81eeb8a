/* cli_files.c: progress, interrupts, opening shots, and output files that appear whole or not at all. */
#define _XOPEN_SOURCE 700 /* setitimer */
#include <errno.h>
#include <fcntl.h>
#include <signal.h>
#include <string.h>
#include <sys/time.h>
#include <unistd.h>

#include "cli.h"

/* State of the process, as a terminal and signals are. */
static volatile sig_atomic_t interrupted;
static bool progress_shown;
static double progress_time;

void cli_progress(const char *verb, size_t done, size_t count)
{
    if (!isatty(STDERR_FILENO))
        return;
    double now = cli_clock();
    if (progress_shown && now - progress_time < 0.2 && done < count)
        return;
    progress_time = now;
    progress_shown = true;
    fprintf(stderr, "\rraddle %s: frame %zu of %zu\033[K", verb, done, count);
    fflush(stderr);
}

void cli_progress_end(void)
{
    if (progress_shown)
        fprintf(stderr, "\r\033[K");
    progress_shown = false;
}

static void on_signal(int number)
{
    (void)number;
    interrupted = 1;
}

/* The first signal asks; a second one ends the process. */
void cli_catch_interrupts(void)
{
    static const int numbers[] = {SIGINT, SIGTERM, SIGHUP};
    struct sigaction action;
    memset(&action, 0, sizeof action);
    action.sa_handler = on_signal;
    action.sa_flags = (int)SA_RESETHAND;
    sigemptyset(&action.sa_mask);
    for (size_t i = 0; i < sizeof numbers / sizeof numbers[0]; i++)
        sigaction(numbers[i], &action, NULL);
}

int cli_interrupted(void)
{
    return interrupted;
}

int cli_cancel(void *user)
{
    (void)user;
    return interrupted;
}

static void limit_processor_time(time_t seconds)
{
    struct itimerval limit = {{0, 0}, {seconds, 0}};
    setitimer(ITIMER_PROF, &limit, NULL);
}

bool cli_open_shot(const char *verb, const char *path, rdl_shot **shot, int *code)
{
    rdl_fault fault = {0, ""};
    limit_processor_time(30);
    rdl_status status = rdl_shot_open(path, shot, &fault);
    limit_processor_time(0);
    if (status != RDL_OK)
        *code = cli_fail(verb, path, -1, status, &fault);
    return status == RDL_OK;
}

bool cli_output_begin(cli_output *output, const char *verb, const char *path, bool force, int *code)
{
    memset(output, 0, sizeof *output);
    output->force = force;
    *code = CLI_BAD_INPUT;
    if (strlen(path) >= sizeof output->path) {
        cli_error(verb, "%s: the name is too long", cli_clean(path));
        return false;
    }
    strcpy(output->path, path);
    if (!force && access(path, F_OK) == 0) {
        *code = cli_fail(verb, path, -1, RDL_FILE_EXISTS, NULL);
        return false;
    }
    snprintf(output->temporary, sizeof output->temporary, "%s.new-%ld", path, (long)getpid());
    int file = open(output->temporary, O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
    output->file = file >= 0 ? fdopen(file, "w") : NULL;
    if (output->file == NULL) {
        *code = errno == ENOENT || errno == ENOTDIR ? CLI_BAD_INPUT : CLI_NOT_FINISHED;
        cli_error(verb, "%s: cannot be written: %s", cli_clean(path), strerror(errno));
        return false;
    }
    cli_pending(output->temporary);
    return true;
}

void cli_output_drop(cli_output *output)
{
    if (output->file == NULL)
        return;
    fclose(output->file);
    output->file = NULL;
    unlink(output->temporary);
    cli_pending(NULL);
}

bool cli_output_end(cli_output *output, const char *verb, int *code)
{
    bool written = fflush(output->file) == 0 && !ferror(output->file) && fsync(fileno(output->file)) == 0;
    int why = errno;
    written = fclose(output->file) == 0 && written;
    output->file = NULL;
    bool named = false;
    if (written)
        named =
            output->force ? rename(output->temporary, output->path) == 0 : link(output->temporary, output->path) == 0;
    if (written && !named)
        why = errno;
    if (!named || !output->force)
        unlink(output->temporary);
    cli_pending(NULL);
    if (named)
        return true;
    *code = why == EEXIST ? CLI_BAD_INPUT : CLI_NOT_FINISHED;
    cli_error(verb, "%s: cannot be written: %s", cli_clean(output->path), strerror(why));
    return false;
}
