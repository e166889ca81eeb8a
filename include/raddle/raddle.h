/* raddle/raddle.h: index of the core library's headers.
 *
 * Conventions. Argument order: context, inputs, in/out, outputs, fault. Lengths in metres, masses in kilograms, times in
 * seconds; times inside a step are shares of the step in [0, 1]. Vertex, element and part indices are 32 bit. Strings are
 * UTF-8. Inputs are borrowed for the call unless a comment says "copied". On an error status outputs are untouched and
 * *fault (if given) names the first offender. Nothing prints, aborts or keeps global state.
 * Usable from C17 and C++17. */
#ifndef RADDLE_RADDLE_H
#define RADDLE_RADDLE_H

#include "engine.h"
#include "host.h"
#include "query.h"
#include "report.h"
#include "rest.h"
#include "scene.h"
#include "settings.h"
#include "status.h"
#include "tree.h"
#include "version.h"

#endif
