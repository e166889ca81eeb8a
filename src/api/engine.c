/* api/engine.c: rdl_engine_...: arguments, floating-point environment, then the driver. */
#include <fenv.h>

#include "api/settings.h"
#include "driver/create.h"
#include "driver/watch.h"

static rdl_status bad(rdl_fault *fault, const char *field)
{
    return rdli_fault_set(fault, RDL_BAD_ARGUMENT, field, 0);
}

static rdl_status begin(const rdl_engine *engine, const rdl_step *step, rdl_fault *fault)
{
    if (engine == NULL)
        return bad(fault, "engine");
    if (step == NULL)
        return bad(fault, "step");
    if (step->size < sizeof(rdl_step))
        return bad(fault, "step.size");
    return RDL_OK;
}

/* The host may run with another rounding mode or with sub-normals flushed; our bits must not depend on it. */
static void hold_environment(fenv_t *saved)
{
    fegetenv(saved);
    fesetenv(FE_DFL_ENV);
}

rdl_status rdl_engine_create(const rdl_scene *scene, const rdl_settings *settings, const rdl_host *host,
                             rdl_engine **engine, rdl_fault *fault)
{
    if (scene == NULL || engine == NULL)
        return bad(fault, scene == NULL ? "scene" : "engine");
    if (host != NULL && host->size < sizeof(rdl_host))
        return bad(fault, "host.size");
    rdl_settings full;
    rdl_status status = rdli_settings_complete(settings, &full, fault);
    if (status != RDL_OK)
        return status;
    fenv_t saved;
    hold_environment(&saved);
    status = rdli_engine_create(scene, &full, host, engine, fault);
    fesetenv(&saved);
    return status;
}

static bool overlaps(const rdl_step *step, size_t vertex_count)
{
    size_t number = step->delivered.format == RDL_FLOAT32 ? sizeof(float) : sizeof(double);
    size_t other = step->start.format == RDL_FLOAT32 ? sizeof(float) : sizeof(double);
    size_t stride = step->delivered.stride != 0 ? step->delivered.stride : 3 * number;
    size_t other_stride = step->start.stride != 0 ? step->start.stride : 3 * other;
    uintptr_t a = (uintptr_t)step->delivered.data, b = (uintptr_t)step->start.data;
    /* Interleaved views (one record holds both) are fine: compare only what starts inside one stride. */
    if (stride == other_stride && (a > b ? a - b : b - a) < stride) {
        size_t apart = a > b ? a - b : b - a;
        return apart < 3 * (a > b ? other : number);
    }
    return a < b + vertex_count * other_stride && b < a + vertex_count * stride;
}

static rdl_status run_step(rdl_engine *engine, const rdl_step *step, rdl_report *report, rdl_fault *fault)
{
    double begun = rdli_now();
    rdl_verdict verdict = RDL_CLEAR;
    rdl_status status = rdli_step_load(engine, step, true, fault);
    if (status == RDL_OK && overlaps(step, engine->scene.mesh.vertex_count))
        status = bad(fault, "delivered");
    if (status == RDL_OK)
        status = rdli_watch_begin(engine);
    if (status == RDL_OK)
        status = rdli_step_run(engine, step, &verdict);
    if (status != RDL_OK)
        return status;
    rdli_view_write(&step->delivered, engine->scene.mesh.vertex_count, engine->trial.data);
    engine->seconds[RDL_TIME_TOTAL] = rdli_now() - begun;
    if (report != NULL)
        rdli_report_fill(engine, verdict, report);
    if (engine->watch_count > 0) {
        rdl_report full = {.size = sizeof full};
        rdli_report_fill(engine, verdict, &full);
        rdli_watch_stepped(engine, step, &full);
    }
    return RDL_OK;
}

rdl_status rdl_engine_step(rdl_engine *engine, const rdl_step *step, rdl_report *report, rdl_fault *fault)
{
    rdl_status status = begin(engine, step, fault);
    if (status != RDL_OK)
        return status;
    if (report != NULL && report->size < offsetof(rdl_report, pairs))
        return bad(fault, "report.size");
    fenv_t saved;
    hold_environment(&saved);
    status = run_step(engine, step, report, fault);
    fesetenv(&saved);
    return status;
}

rdl_status rdl_engine_safe_fraction(rdl_engine *engine, const rdl_step *step, double *fraction, rdl_fault *fault)
{
    rdl_status status = begin(engine, step, fault);
    if (status != RDL_OK)
        return status;
    if (fraction == NULL)
        return bad(fault, "fraction");
    fenv_t saved;
    hold_environment(&saved);
    status = rdli_step_load(engine, step, false, fault);
    if (status == RDL_OK)
        status = rdli_safe_fraction(engine, fraction);
    fesetenv(&saved);
    return status;
}

rdl_status rdl_engine_reset(rdl_engine *engine)
{
    if (engine == NULL)
        return RDL_BAD_ARGUMENT;
    engine->crossing_count = 0;
    engine->known = false;
    return RDL_OK;
}

void rdl_engine_destroy(rdl_engine *engine)
{
    if (engine != NULL)
        rdli_engine_destroy(engine);
}

const uint32_t (*rdl_engine_edges(const rdl_engine *engine, size_t *count))[2]
{
    if (count != NULL)
        *count = engine != NULL ? engine->scene.mesh.edge_count : 0;
    return engine != NULL ? engine->scene.mesh.edges : NULL;
}

void rdl_engine_settings(const rdl_engine *engine, rdl_settings *settings)
{
    if (engine != NULL && settings != NULL)
        *settings = engine->settings;
}

size_t rdl_engine_bytes(const rdl_engine *engine)
{
    return engine != NULL ? engine->memory.bytes_in_use : 0;
}

rdl_status rdl_engine_memory_read(const rdl_engine *engine, void *block, size_t *bytes)
{
    if (engine == NULL || bytes == NULL)
        return RDL_BAD_ARGUMENT;
    size_t need = rdli_memory_block_bytes(engine);
    if (block != NULL) {
        if (*bytes < need)
            return RDL_OUT_OF_RANGE;
        rdli_memory_block_write(engine, block);
    }
    *bytes = need;
    return RDL_OK;
}

rdl_status rdl_engine_memory_write(rdl_engine *engine, const void *block, size_t bytes)
{
    if (engine == NULL || block == NULL)
        return RDL_BAD_ARGUMENT;
    return rdli_memory_block_read(engine, block, bytes);
}
