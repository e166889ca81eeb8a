/* api/tangles.c: rdl_find_tangles, rdl_tangles_release. */
#include "driver/rest.h"
#include "intake/intake.h"

typedef struct session {
    rdli_memory memory;
    rdli_workers *workers;
    rdli_scene scene;
    rdli_room rows;
} session;

static rdl_status search(session *s, const rdl_scene *scene, const rdl_view *positions, int include_driven,
                         const rdl_host *host, size_t *count, rdl_fault *fault)
{
    rdl_status status = rdli_scene_check(scene, &s->memory, fault);
    if (status == RDL_OK)
        status = rdli_view_check(positions, scene->vertex_count, "positions", fault);
    if (status == RDL_OK)
        status = rdli_workers_create(&s->memory, host, &s->workers);
    if (status == RDL_OK)
        status = rdli_scene_build(&s->scene, scene, &s->memory);
    if (status != RDL_OK)
        return status;
    double (*x)[3] = rdli_take(&s->memory, scene->vertex_count, sizeof *x);
    if (x == NULL)
        return RDL_NO_MEMORY;
    rdli_view_read(positions, scene->vertex_count, x);
    status = rdli_rest_find(&s->memory, s->workers, &s->scene.mesh, (const double (*)[3])x, include_driven != 0, NULL,
                            &s->rows, count);
    rdli_give(&s->memory, x, scene->vertex_count, sizeof *x);
    return status;
}

rdl_status rdl_find_tangles(const rdl_scene *scene, const rdl_view *positions, int include_driven, const rdl_host *host,
                            rdl_tangles *tangles, rdl_fault *fault)
{
    if (scene == NULL || positions == NULL || tangles == NULL)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, scene == NULL ? "scene" : positions == NULL ? "positions" : "tangles", 0);
    session s;
    memset(&s, 0, sizeof s);
    if (rdli_memory_init(&s.memory, host) != RDL_OK)
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, "host", 0);
    size_t count = 0;
    rdl_status status = search(&s, scene, positions, include_driven, host, &count, fault);
    rdl_tangle *items = NULL;
    if (status == RDL_OK && count > 0) {
        items = rdli_take(&s.memory, count, sizeof *items);
        if (items == NULL)
            status = RDL_NO_MEMORY;
        else
            memcpy(items, s.rows.data, count * sizeof *items);
    }
    if (status == RDL_OK) {
        tangles->count = count;
        tangles->items = items;
    }
    rdli_room_release(&s.memory, &s.rows);
    rdli_scene_release(&s.scene, &s.memory);
    rdli_workers_destroy(&s.memory, s.workers);
    return status;
}

void rdl_tangles_release(rdl_tangles *tangles, const rdl_host *host)
{
    rdli_memory memory;
    if (tangles == NULL || tangles->items == NULL || rdli_memory_init(&memory, host) != RDL_OK)
        return;
    memory.bytes_in_use = tangles->count * sizeof *tangles->items;
    rdli_give(&memory, tangles->items, tangles->count, sizeof *tangles->items);
    tangles->items = NULL;
    tangles->count = 0;
}
