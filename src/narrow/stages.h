/* narrow/stages.h: how a pair goes from stage to stage. Inside narrow only. */
#ifndef RDLI_STAGES_H
#define RDLI_STAGES_H

#include "narrow/screen.h"

/* A motion brought to ordinary size: its coordinates times 2^shift. */
typedef struct rdli_sized {
    rdl_motion motion;
    int shift;
} rdli_sized;

void rdli_sized_of(const rdl_motion *motion, rdli_sized *sized);
/* The screen for one pair; true when it settles the pair: touch is filled then. */
bool rdli_screen_one(rdli_screen *screen, int kind, const rdli_sized *sized, double gap, rdl_touch *touch);
/* Everything behind the screen. */
void rdli_find_open_touch(int kind, const rdl_motion *motion, const rdli_sized *sized, double gap, rdl_touch *touch);

#endif
