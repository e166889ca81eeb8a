/* scenes/saboteurs.h: resolvers that do nothing useful and say that all is well: the judge must see through them. */
#ifndef SCENES_SABOTEURS_H
#define SCENES_SABOTEURS_H

#include "play.h"

resolver saboteur_start;    /* driven vertices go their way, all others stay */
resolver saboteur_proposed; /* the proposal as it is */

#endif
