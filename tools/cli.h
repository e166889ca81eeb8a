/* cli.h: what the verbs of the program share: command lines, messages, progress, interrupts, output files.
 * Exit codes: see CLI_...; every verb returns one of them. */
#ifndef RADDLE_TOOLS_CLI_H
#define RADDLE_TOOLS_CLI_H

#include <jansson.h>
#include <stdbool.h>
#include <stdio.h>

#include <raddle/raddle.h>
#include <raddle/shot.h>

enum {
    CLI_DONE = 0,         /* done, nothing wrong */
    CLI_FINDINGS = 1,     /* done, with findings */
    CLI_BAD_INPUT = 2,    /* bad usage or input */
    CLI_NOT_FINISHED = 3, /* memory, disk, something not checked */
    CLI_INTERRUPTED = 130
};

/* ---- command lines ---- */

typedef struct cli_option {
    const char *name;  /* without the dashes; "o" is -o, all others take two */
    const char *value; /* placeholder of its value, or NULL: a switch */
    const char *help;
} cli_option;

enum { CLI_OPTIONS_MAX = 24, CLI_SETTINGS_MAX = 64, CLI_OPERANDS_MAX = 4096 };

typedef struct cli_spec {
    const char *verb, *operands, *summary; /* "check", "SHOT", one sentence */
    const char *notes;                     /* more for --help, or NULL */
    const cli_option *options;
    size_t option_count, operands_min, operands_max;
    bool settings; /* true: one option per row of rdl_settings_table too */
} cli_spec;

typedef struct cli_line {
    const char *values[CLI_OPTIONS_MAX];    /* by option; NULL: not given; a switch that is given: "" */
    const char *settings[CLI_SETTINGS_MAX]; /* by row of the table */
    const char *operands[CLI_OPERANDS_MAX];
    size_t operand_count;
} cli_line;

/* argv[0] is the verb. Returns true to go on; false: *code is the exit code (help was printed, or an error). */
bool cli_read(const cli_spec *spec, int argc, char **argv, cli_line *line, int *code);
/* A number of an option within bounds; whole: no fraction. False: an error was printed. */
bool cli_number(const cli_spec *spec, const char *option, const char *text, double lowest, double highest, bool whole,
                double *value);
/* Settings of the command line over *settings; switches take on and off as well as 1 and 0. */
bool cli_settings(const cli_spec *spec, const cli_line *line, rdl_settings *settings);
/* -1, or the index of the option. */
int cli_find_option(const cli_spec *spec, const char *name);
/* The value given for an option, or NULL. */
const char *cli_value(const cli_spec *spec, const cli_line *line, const char *name);

/* ---- messages: one line on standard error each ---- */

void cli_error(const char *verb, const char *format, ...) __attribute__((format(printf, 2, 3)));
/* Names file, field and first offender; returns the exit code that fits. frame < 0: no frame to name. */
int cli_fail(const char *verb, const char *file, long long frame, rdl_status status, const rdl_fault *fault);
/* A text of a file or command line, made safe to print: control characters as \n, \x1b. Valid for the next 7 calls. */
const char *cli_clean(const char *text);
/* One object on standard output. Takes the reference. NULL: no memory. */
int cli_print_json(const char *verb, json_t *object, int code);
/* A text for JSON; names in files are valid UTF-8, file names need not be. */
json_t *cli_json_text(const char *text);

/* Opens a shot, within half a minute of processor time: HDF5 can loop over a broken file. False: *code is set, an error
 * was printed. */
bool cli_open_shot(const char *verb, const char *path, rdl_shot **shot, int *code);

/* ---- progress on standard error when it is a terminal ---- */
void cli_progress(const char *verb, size_t done, size_t count);
void cli_progress_end(void);

/* ---- interrupts ---- */
void cli_catch_interrupts(void);
int cli_interrupted(void);
int cli_cancel(void *user); /* for rdl_host.cancel */

/* ---- output files: whole or not at all ---- */
typedef struct cli_output {
    FILE *file;
    char path[4096], temporary[4096 + 32];
    bool force;
} cli_output;
/* False: an error was printed and *code set. */
bool cli_output_begin(cli_output *output, const char *verb, const char *path, bool force, int *code);
bool cli_output_end(cli_output *output, const char *verb, int *code);
void cli_output_drop(cli_output *output);
/* To be called around the life of any file that must not survive a crash of this process: see main.c. NULL: none. */
void cli_pending(const char *path);

/* Monotonic seconds. */
double cli_clock(void);

#endif
