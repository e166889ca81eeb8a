/* scenes/list.c: the list of scenes. */
#include "parts.h"
#include "scenes.h"

const scene scenes[] = {
    {"stack", 40, ALSO_FLOAT32, build_stack, NULL, NULL, accept_free, NULL, finish_stack},
    {"rest", 60, ALSO_LARGE, build_rest, NULL, NULL, accept_free, NULL, finish_rest},
    {"slide", 20, ALSO_FLOAT32 | QUICK, build_slide, NULL, NULL, accept_free, inspect_slide, finish_slide},
    {"funnel", 60, 0, build_funnel, drive_funnel, NULL, accept_free, NULL, finish_funnel},
    {"dense", 12, 0, build_dense, NULL, NULL, accept_free, NULL, finish_dense},
    {"links", 50, ALSO_FLOAT32 | ALSO_SMALL | QUICK, build_links, drive_links, NULL, accept_free, NULL, finish_links},
    {"knot", 100, ALSO_SMALL | QUICK, build_knot, drive_knot, NULL, accept_free, inspect_knot, finish_knot},
    {"curtain_0.1", 30, 0, build_curtain_0_1, drive_curtain_0_1, NULL, accept_free, NULL, finish_curtain},
    {"curtain_1", 30, 0, build_curtain_1, drive_curtain_1, NULL, accept_free, NULL, finish_curtain},
    {"curtain_10", 30, QUICK, build_curtain_10, drive_curtain_10, NULL, accept_free, NULL, finish_curtain},
    {"curtain_100", 20, 0, build_curtain_100, drive_curtain_100, NULL, accept_free, NULL, finish_curtain},
    {"curtain_1000", 20, 0, build_curtain_1000, drive_curtain_1000, NULL, accept_free, NULL, finish_curtain},
    {"plates", 30, PLATES, build_plates, drive_plates, NULL, verdicts_plates, inspect_plates, NULL},
    {"comb", 42, ALSO_FLOAT32 | QUICK, build_comb, drive_comb, NULL, accept_free, NULL, finish_comb},
    {"spin_border", 22, 0, build_spin_border, drive_spin_border, NULL, accept_free, inspect_spin, finish_spin},
    {"spin_whole", 22, ALSO_SMALL | QUICK, build_spin_whole, NULL, dictate_spin_whole, accept_free, inspect_spin,
     finish_spin},
    {"tangled", 20, QUICK, build_tangled, NULL, NULL, accept_tangled, NULL, finish_tangled},
    {"touching", 14, QUICK, build_touching, NULL, dictate_touching, accept_free, inspect_touching, finish_touching},
    {"free", 30, ALSO_FLOAT32 | ALSO_SMALL | ALSO_LARGE | QUICK, build_free, NULL, NULL, accept_clear, NULL, NULL},
    {"tilted", 24, ALSO_LARGE | QUICK, build_tilted, NULL, NULL, verdicts_tilted, NULL, finish_tilted},
};

const int scene_count = (int)(sizeof scenes / sizeof scenes[0]);
