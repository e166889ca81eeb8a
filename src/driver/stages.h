/* driver/stages.h: what step.c calls around the pieces. Included by driver only. */
#ifndef RDLI_STAGES_H
#define RDLI_STAGES_H

#include "driver/engine.h"

/* outcome.c: empties the outcome of the last step. */
void rdli_outcome_begin(rdl_engine *engine);
/* Books contacts, zones, impulses and energies of a piece that covers `length` of the step. */
rdl_status rdli_outcome_piece(rdl_engine *engine, const rdli_piece *piece, double length);
/* Held and moved vertices, impulses in SI units, the verdict. */
rdl_status rdli_outcome_end(rdl_engine *engine, double duration, rdl_verdict *verdict);

/* verify.c: one more detection over the delivered path at the true floors, from nothing. Pairs that do not keep them are
 * named; new crossings are remembered. */
rdl_status rdli_verify(rdl_engine *engine);

/* history.c: names what is wrong at the start: intersections, contacts, remembered crossings. */
rdl_status rdli_history_begin(rdl_engine *engine);
/* Forgets crossings that came back, and keeps the delivered bits for the next step. */
rdl_status rdli_history_end(rdl_engine *engine);
rdl_status rdli_remember_crossing(rdl_engine *engine, const rdli_hit *hit, const double (*before)[3]);

#endif
