/* scenes/scenes.h: what the list of scenes is made of; each is described where it is defined. */
#ifndef SCENES_SCENES_H
#define SCENES_SCENES_H

#include "play.h"

/* scenes_fall.c */
void build_stack(world *w);
void finish_stack(judge *j, unsigned steps, const uint64_t verdicts[4]);
void build_rest(world *w);
void finish_rest(judge *j, unsigned steps, const uint64_t verdicts[4]);
void build_funnel(world *w);
void drive_funnel(const world *w, unsigned step, double (*proposed)[3]);
void finish_funnel(judge *j, unsigned steps, const uint64_t verdicts[4]);
void build_dense(world *w);
void finish_dense(judge *j, unsigned steps, const uint64_t verdicts[4]);

/* scenes_loops.c */
void build_links(world *w);
void drive_links(const world *w, unsigned step, double (*proposed)[3]);
void finish_links(judge *j, unsigned steps, const uint64_t verdicts[4]);
void build_knot(world *w);
void drive_knot(const world *w, unsigned step, double (*proposed)[3]);
void inspect_knot(judge *j, const judge_step *step);
void finish_knot(judge *j, unsigned steps, const uint64_t verdicts[4]);

/* scenes_driven.c */
void build_curtain_0_1(world *w);
void build_curtain_1(world *w);
void build_curtain_10(world *w);
void build_curtain_100(world *w);
void build_curtain_1000(world *w);
void drive_curtain_0_1(const world *w, unsigned step, double (*proposed)[3]);
void drive_curtain_1(const world *w, unsigned step, double (*proposed)[3]);
void drive_curtain_10(const world *w, unsigned step, double (*proposed)[3]);
void drive_curtain_100(const world *w, unsigned step, double (*proposed)[3]);
void drive_curtain_1000(const world *w, unsigned step, double (*proposed)[3]);
void finish_curtain(judge *j, unsigned steps, const uint64_t verdicts[4]);
void build_plates(world *w);
void drive_plates(const world *w, unsigned step, double (*proposed)[3]);
unsigned verdicts_plates(const world *w, unsigned step);
void inspect_plates(judge *j, const judge_step *step);
void build_comb(world *w);
void drive_comb(const world *w, unsigned step, double (*proposed)[3]);
void finish_comb(judge *j, unsigned steps, const uint64_t verdicts[4]);

/* scenes_sheets.c */
void build_spin_border(world *w);
void drive_spin_border(const world *w, unsigned step, double (*proposed)[3]);
void build_spin_whole(world *w);
void dictate_spin_whole(const world *w, unsigned step, double (*proposed)[3]);
void inspect_spin(judge *j, const judge_step *step);
void finish_spin(judge *j, unsigned steps, const uint64_t verdicts[4]);
void build_tangled(world *w);
void finish_tangled(judge *j, unsigned steps, const uint64_t verdicts[4]);
void build_touching(world *w);
void dictate_touching(const world *w, unsigned step, double (*proposed)[3]);
void inspect_touching(judge *j, const judge_step *step);
void finish_touching(judge *j, unsigned steps, const uint64_t verdicts[4]);
void build_free(world *w);
void build_tilted(world *w);
unsigned verdicts_tilted(const world *w, unsigned step);
void finish_tilted(judge *j, unsigned steps, const uint64_t verdicts[4]);
void build_slide(world *w);
void inspect_slide(judge *j, const judge_step *step);
void finish_slide(judge *j, unsigned steps, const uint64_t verdicts[4]);

#endif
