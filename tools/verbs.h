/* verbs.h: one function per verb; argv[0] is the verb's name; returns the exit code. */
#ifndef RADDLE_TOOLS_VERBS_H
#define RADDLE_TOOLS_VERBS_H

/* `raddle --version`. */
int print_version(void);
int verb_demo(int argc, char **argv);
int verb_import(int argc, char **argv);
int verb_info(int argc, char **argv);
int verb_resolve(int argc, char **argv);
int verb_check(int argc, char **argv);
int verb_export(int argc, char **argv);
int verb_replay(int argc, char **argv);
int verb_reduce(int argc, char **argv);

#endif
