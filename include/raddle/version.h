/* raddle/version.h: library version and the export macro.
 * Usable from C17 and C++17. */
#ifndef RADDLE_VERSION_H
#define RADDLE_VERSION_H

#define RDL_VERSION_MAJOR 0
#define RDL_VERSION_MINOR 1
#define RDL_VERSION_PATCH 0
#define RDL_VERSION_TEXT "0.1.0"

#if defined(__GNUC__)
#define RDL_API __attribute__((visibility("default")))
#else
#define RDL_API
#endif

#ifdef __cplusplus
extern "C" {
#endif

/* The version of the library that is linked, as text "major.minor.patch".
 * Static storage; safe from any thread. */
RDL_API const char *rdl_version(void);

#ifdef __cplusplus
}
#endif
#endif
