/* response/response.h: contacts -> zones -> corrected positions. Included by driver only. */
#ifndef RDLI_RESPONSE_H
#define RDLI_RESPONSE_H

#include "base/workers.h"
#include "flow/contacts.h"

/* Sums over a group of vertices: see rdli_zone_raise_gaining. */
typedef struct rdli_group_sums {
    double mass, moved[3], meant[3], after, before, against;
    bool fed;     /* loaded contacts with fixed vertices that move */
    bool leaning; /* loaded contacts with fixed vertices, moving or not */
    bool gains, far; /* energy; further from the target than the start is */
} rdli_group_sums;

typedef struct rdli_response {
    rdli_memory *memory;
    rdli_workers *workers;
    rdli_room parent, stamp, local;      /* per vertex: union-find, pass in which it was last seen, number in its zone */
    uint32_t pass_stamp;
    rdli_room zones, zone_contacts, zone_vertices;
    rdli_room rows, loads, all_loads, row_work, inverse_mass, targets, solutions, scratch, sums, dense;
    uint32_t zone_count;
    size_t row_total, vertex_total, dense_each; /* dense_each: doubles of dense work space per worker */
} rdli_response;

/* What the zones need to know about one piece of a step. */
typedef struct rdli_piece {
    uint32_t vertex_count;
    const uint8_t *fixed;       /* driven, or held in this step */
    const double *mass;         /* kg */
    const double (*start)[3];   /* certified start of the piece, m */
    const double (*target)[3];  /* where the host wants the vertices at the end of the piece, m */
    double (*trial)[3];         /* in/out: the present answer, representable in the delivered format, m */
    int format;                 /* RDL_FLOAT32 or RDL_FLOAT64 */
    double aim_margin;
    bool shortest;              /* no shorter piece will be tried */
    bool long_piece;            /* worth cutting before it is solved, if it goes deep */
    uint32_t sweeps_max;
} rdli_piece;

void rdli_response_init(rdli_response *response, rdli_memory *memory, rdli_workers *workers);
void rdli_response_release(rdli_response *response);

/* Joins contacts that share movable vertices into zones, in the order of the contact list; sets contact.zone and the
 * flags of each zone. RDL_NO_MEMORY on failure. */
rdl_status rdli_zones_gather(rdli_response *response, const rdli_piece *piece, rdli_contact *contacts, size_t count);

/* Solves every zone that is not settled, in parallel, and writes the rounded answer into piece->trial. awake gets 1 for
 * each vertex whose trial bits changed (entries are only set, never cleared). Sets zone results, and settled of the
 * contacts. */
rdl_status rdli_zones_solve(rdli_response *response, const rdli_piece *piece, rdli_contact *contacts, uint8_t *awake);

/* Any plane or fixed direction of the contact has a multiplier above zero. */
bool rdli_carries_load(const rdli_contact *contact);

/* Kinetic energies of the zone as the displacements of the piece tell them, kg m^2: wanted and delivered; without driven
 * vertices in the frame of the zone's centre of mass. */
void rdli_zone_energies(const rdli_response *response, const rdli_piece *piece, rdli_zone *zone);

/* Looks for groups of the zone that no driven vertex feeds and that have more kinetic energy than was wanted, in the frame of
 * their own centre of mass and beyond rounding, and for groups that lean on nothing but vertices at rest and are further from
 * where they should be than their start is. Sends the contacts inside them to the next level, and is true when there were
 * any to send. A group is what contacts that carry load join: contacts that carry none pass no impulse on, so that energy
 * may not pass either. */
bool rdli_zone_raise_gaining(rdli_response *response, const rdli_piece *piece, rdli_contact *contacts,
                             const rdli_zone *zone);

/* Makes room for row_total rows and vertex_total vertices. */
rdl_status rdli_response_reserve(rdli_response *response);

/* Velocity impulses of the contacts that carry load: for each zone the smallest impulses along the contact normals with
 * which no contact approaches (restitution 0), or separates at `restitution` times its approach. `length`: the piece's share of
 * the step. `velocity` (in/out, m per
 * step) gets M^-1 J' impulse added; the planes must be up to date with the delivered positions; impulse[RDLI_PLANES c + k]
 * gets the impulse of plane k of contact c (kg m per step), or -1 where the plane carried no load. */
rdl_status rdli_zones_impulses(rdli_response *response, const rdli_piece *piece, const rdli_contact *contacts, size_t count,
                               double restitution, double length, double (*velocity)[3], double *impulse);

/* The rigid motion nearest to the targets in the mass metric (Provot 1997; Bridson et al. 2002): linear and angular
 * momentum of target - start are kept. The rotation is the Cayley transform of the angular displacement, below 120
 * degrees, so that distances inside the zone keep half of themselves along the straight paths. All vertices must be
 * movable. count vertices, listed by global number. Ends are rounded, which may shorten distances: the zone grows about
 * its centre by what rounding can take from smallest_floor (m), a relative 1e-12 or so for doubles. */
void rdli_rigid_motion(const rdli_piece *piece, const uint32_t *vertices, size_t count, double smallest_floor,
                       double (*solution)[3]);

#endif
