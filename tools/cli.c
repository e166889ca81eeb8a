/* cli.c: command lines and messages. */
#include "cli.h"

#include <ctype.h>
#include <errno.h>
#include <math.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

static bool same_name(const char *a, const char *b, size_t length)
{
    for (size_t i = 0; i < length; i++) {
        char x = a[i] == '-' ? '_' : a[i], y = b[i] == '-' ? '_' : b[i];
        if (x != y)
            return false;
    }
    return b[length] == '\0';
}

static void print_option(const char *name, const char *value, const char *help)
{
    char left[64];
    snprintf(left, sizeof left, "%s%s%s%s", strlen(name) == 1 ? "-" : "--", name, value != NULL ? " " : "",
             value != NULL ? value : "");
    for (char *c = left; *c != '\0'; c++)
        *c = *c == '_' ? '-' : *c;
    printf("  %-26s %s\n", left, help);
}

static void print_help(const cli_spec *spec)
{
    printf("usage: raddle %s %s%s[OPTIONS]\n\n%s\n\n", spec->verb, spec->operands, spec->operands[0] != '\0' ? " " : "",
           spec->summary);
    for (size_t i = 0; i < spec->option_count; i++)
        print_option(spec->options[i].name, spec->options[i].value, spec->options[i].help);
    print_option("help", NULL, "print this text");
    if (spec->settings) {
        size_t count = 0;
        const rdl_setting_info *table = rdl_settings_table(&count);
        printf("\nSettings of the engine (default: as recorded in the shot, else the number in brackets):\n");
        for (size_t row = 0; row < count; row++) {
            char help[256];
            snprintf(help, sizeof help, "[%.9g] %s", table[row].initial, table[row].purpose);
            print_option(table[row].name, "N", help);
        }
    }
    if (spec->notes != NULL)
        printf("\n%s\n", spec->notes);
    printf("\nExit code: 0 done, 1 done with findings, 2 bad usage or input, 3 could not finish, 130 interrupted.\n");
}

/* Finds where the value of an option goes; NULL: no such option. */
static const char **find_place(const cli_spec *spec, cli_line *line, const char *name, size_t length, bool is_long,
                               bool *takes_value)
{
    for (size_t i = 0; i < spec->option_count; i++) {
        const cli_option *option = &spec->options[i];
        if ((strlen(option->name) > 1) == is_long && same_name(name, option->name, length) &&
            strlen(option->name) == length) {
            *takes_value = option->value != NULL;
            return &line->values[i];
        }
    }
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    for (size_t row = 0; spec->settings && is_long && row < count && row < CLI_SETTINGS_MAX; row++)
        if (strlen(table[row].name) == length && same_name(name, table[row].name, length)) {
            *takes_value = true;
            return &line->settings[row];
        }
    return NULL;
}

static bool take_option(const cli_spec *spec, int argc, char **argv, int *at, cli_line *line)
{
    const char *text = argv[*at];
    bool is_long = text[1] == '-', takes_value = false;
    const char *name = text + (is_long ? 2 : 1);
    size_t length = is_long ? strcspn(name, "=") : strlen(name);
    const char *attached = name[length] == '=' ? name + length + 1 : NULL;
    const char **place = find_place(spec, line, name, length, is_long, &takes_value);
    if (place == NULL) {
        cli_error(spec->verb, "unknown option %s (see raddle %s --help)", cli_clean(text), spec->verb);
        return false;
    }
    if (!takes_value && attached != NULL) {
        cli_error(spec->verb, "%s takes no value", cli_clean(text));
        return false;
    }
    if (!takes_value) {
        *place = "";
        return true;
    }
    if (attached == NULL && *at + 1 >= argc) {
        cli_error(spec->verb, "%s needs a value", cli_clean(text));
        return false;
    }
    *place = attached != NULL ? attached : argv[++*at];
    return true;
}

bool cli_read(const cli_spec *spec, int argc, char **argv, cli_line *line, int *code)
{
    bool only_operands = false;
    memset(line, 0, sizeof *line);
    *code = CLI_BAD_INPUT;
    for (int i = 1; i < argc; i++) {
        if (!only_operands && strcmp(argv[i], "--help") == 0) {
            print_help(spec);
            *code = CLI_DONE;
            return false;
        }
        if (!only_operands && strcmp(argv[i], "--") == 0) {
            only_operands = true;
        } else if (!only_operands && argv[i][0] == '-' && argv[i][1] != '\0') {
            if (!take_option(spec, argc, argv, &i, line))
                return false;
        } else if (line->operand_count >= spec->operands_max || line->operand_count >= CLI_OPERANDS_MAX) {
            cli_error(spec->verb, "unexpected argument %s (see raddle %s --help)", cli_clean(argv[i]), spec->verb);
            return false;
        } else {
            line->operands[line->operand_count++] = argv[i];
        }
    }
    if (line->operand_count < spec->operands_min) {
        cli_error(spec->verb, "missing argument: raddle %s %s (see raddle %s --help)", spec->verb, spec->operands,
                  spec->verb);
        return false;
    }
    return true;
}

bool cli_number(const cli_spec *spec, const char *option, const char *text, double lowest, double highest, bool whole,
                double *value)
{
    char *end = NULL;
    double number = strtod(text, &end);
    if (text[0] == '\0' || *end != '\0' || !isfinite(number) || (whole && number != floor(number))) {
        cli_error(spec->verb, "--%s: %s is not a %snumber", option, cli_clean(text), whole ? "whole " : "");
        return false;
    }
    if (!(number >= lowest && number <= highest)) {
        cli_error(spec->verb, "--%s: %s is outside %.9g to %.9g", option, cli_clean(text), lowest, highest);
        return false;
    }
    *value = number;
    return true;
}

bool cli_settings(const cli_spec *spec, const cli_line *line, rdl_settings *settings)
{
    size_t count = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    for (size_t row = 0; row < count && row < CLI_SETTINGS_MAX; row++) {
        double value = 0;
        const char *text = line->settings[row];
        if (text == NULL)
            continue;
        if (strcmp(table[row].unit, "switch") == 0 && (strcmp(text, "on") == 0 || strcmp(text, "off") == 0))
            text = strcmp(text, "on") == 0 ? "1" : "0";
        if (!cli_number(spec, table[row].name, text, table[row].lowest, table[row].highest,
                        table[row].whole != 0, &value))
            return false;
        memcpy((char *)settings + table[row].offset, &value, sizeof value);
    }
    return true;
}

int cli_find_option(const cli_spec *spec, const char *name)
{
    for (size_t i = 0; i < spec->option_count; i++)
        if (strcmp(spec->options[i].name, name) == 0)
            return (int)i;
    return -1;
}

const char *cli_value(const cli_spec *spec, const cli_line *line, const char *name)
{
    int option = cli_find_option(spec, name);
    return option < 0 ? NULL : line->values[option];
}

const char *cli_clean(const char *text)
{
    static char rooms[8][1024];
    static unsigned next;
    char *room = rooms[next = (next + 1) % 8];
    size_t used = 0;
    for (const unsigned char *c = (const unsigned char *)text; *c != '\0' && used + 8 < sizeof rooms[0]; c++) {
        if (*c == '\n')
            used += (size_t)sprintf(room + used, "\\n");
        else if (*c < 0x20 || *c == 0x7f)
            used += (size_t)sprintf(room + used, "\\x%02x", *c);
        else
            room[used++] = (char)*c;
    }
    room[used] = '\0';
    return room;
}

void cli_error(const char *verb, const char *format, ...)
{
    va_list list;
    cli_progress_end();
    fprintf(stderr, verb[0] != '\0' ? "raddle %s: " : "raddle: %s", verb);
    va_start(list, format);
    vfprintf(stderr, format, list);
    va_end(list);
    fputc('\n', stderr);
}

static int exit_code_of(rdl_status status)
{
    switch (status) {
    case RDL_OK: return CLI_DONE;
    case RDL_NO_MEMORY:
    case RDL_WRITE_FAILED: return CLI_NOT_FINISHED;
    case RDL_CANCELLED: return CLI_INTERRUPTED;
    default: return CLI_BAD_INPUT;
    }
}

int cli_fail(const char *verb, const char *file, long long frame, rdl_status status, const rdl_fault *fault)
{
    char where[128] = "", when[48] = "";
    const char *suffix = "";
    const char *field = fault != NULL ? fault->field : "";
    if (strcmp(field, "file.part") == 0)
        suffix = ".part";
    else if (field[0] != '\0' && strcmp(field, "file") != 0)
        snprintf(where, sizeof where, ": %s %llu", cli_clean(field), (unsigned long long)fault->index);
    if (frame >= 0)
        snprintf(when, sizeof when, ": frame %lld", frame);
    cli_error(verb, "%s%s%s%s: %s%s", cli_clean(file), suffix, when, where, rdl_status_text(status),
              status == RDL_FILE_EXISTS ? " (--force replaces it)" : "");
    return exit_code_of(status);
}

json_t *cli_json_text(const char *text)
{
    json_t *value = json_string(text);
    return value != NULL ? value : json_string(cli_clean("(not UTF-8)"));
}

int cli_print_json(const char *verb, json_t *object, int code)
{
    if (object == NULL || json_dumpf(object, stdout, JSON_INDENT(2) | JSON_REAL_PRECISION(17)) != 0) {
        json_decref(object);
        cli_error(verb, "%s", rdl_status_text(RDL_NO_MEMORY));
        return CLI_NOT_FINISHED;
    }
    putchar('\n');
    json_decref(object);
    return code;
}

double cli_clock(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}
