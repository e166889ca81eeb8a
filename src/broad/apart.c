/* broad/apart.c: see apart.h. */
#include "broad/apart.h"

enum { BLOCK = 4096 }; /* vertices per task */

typedef struct fill_job {
    const rdli_mesh *mesh;
    const rdli_motion *motion;
    rdli_record *records;
    double centre[3], end_centre[3], per_step; /* centre of the grid at the start and at the end; 1 / q */
} fill_job;

static const double REACH = 0x1p29; /* steps from the centre to the border of the grid */

/* Within one step of x: the cast cuts off less than one, and what the subtraction loses (2^-52 of 2^29 steps) is nothing
 * beside the two steps that apart_body.h allows for. */
static int32_t on_grid(double x, bool *inside)
{
    *inside = *inside && x >= -REACH && x <= REACH;
    return *inside ? (int32_t)x : 0;
}

static void fill_block(void *data, size_t block, unsigned worker)
{
    (void)worker;
    const fill_job *job = data;
    const size_t count = job->mesh->vertex_count, end = (block + 1) * BLOCK < count ? (block + 1) * BLOCK : count;
    for (size_t v = block * BLOCK; v < end; v++) {
        rdli_record record = {.spare = 0};
        bool inside = true;
        for (unsigned k = 0; k < 3; k++) {
            record.start[k] = on_grid((job->motion->start[v][k] - job->centre[k]) * job->per_step, &inside);
            record.end[k] = on_grid((job->motion->end[v][k] - job->end_centre[k]) * job->per_step, &inside);
        }
        /* The factor outweighs the rounding of normal floats, the summand that of smaller ones. */
        double half = job->mesh->vertex_half[v] * job->per_step;
        record.half = inside ? (float)(half * (1 + 0x1p-22) + 0x1p-126) : INFINITY;
        job->records[v] = record;
    }
}

rdl_status rdli_apart_fill(rdli_memory *memory, rdli_workers *workers, rdli_apart *apart, const rdli_mesh *mesh,
                           const rdli_motion *motion, const rdli_tree *vertices, const double shift[3])
{
    apart->records = NULL;
    if (mesh->vertex_count == 0)
        return RDL_OK;
    if (!rdli_room_reserve(memory, &apart->record_room, mesh->vertex_count, sizeof(rdli_record), false))
        return RDL_NO_MEMORY;
    fill_job job = {.mesh = mesh, .motion = motion, .records = apart->record_room.data};
    const rdli_pack *crown = vertices->packs[vertices->levels];
    double reach = 0;
    for (unsigned k = 0; k < 3; k++) {
        double lo = (double)crown->lo[k][0], hi = (double)crown->hi[k][0];
        job.centre[k] = 0.5 * (lo + hi);
        job.end_centre[k] = job.centre[k] + shift[k]; /* its rounding moves all vertices alike */
        reach = fmax(reach, 0.5 * (hi - lo));
    }
    int exponent;
    frexp(reach, &exponent); /* reach <= 2^exponent */
    job.per_step = ldexp(REACH, -exponent);
    rdli_parallel_for(workers, ((size_t)mesh->vertex_count + BLOCK - 1) / BLOCK, fill_block, &job);
    apart->records = job.records;
    return RDL_OK;
}
