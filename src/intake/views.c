/* intake/views.c: strided float or double views. */
#include "intake/intake.h"

static size_t number_bytes(int format)
{
    return format == RDL_FLOAT32 ? sizeof(float) : sizeof(double);
}

static size_t stride_of(size_t stride, int format)
{
    return stride != 0 ? stride : 3 * number_bytes(format);
}

static rdl_status check_shape(const void *data, size_t stride, int format, const char *field, rdl_fault *fault)
{
    if (data == NULL || (format != RDL_FLOAT32 && format != RDL_FLOAT64))
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, field, 0);
    size_t number = number_bytes(format);
    if ((uintptr_t)data % number != 0 || stride % number != 0 || (stride != 0 && stride < 3 * number))
        return rdli_fault_set(fault, RDL_BAD_ARGUMENT, field, 0);
    return RDL_OK;
}

static void read_vertex(const void *data, size_t stride, int format, size_t v, double x[3])
{
    const char *at = (const char *)data + v * stride;
    if (format == RDL_FLOAT32) {
        const float *f = (const void *)at;
        for (int k = 0; k < 3; k++)
            x[k] = (double)f[k];
    } else {
        memcpy(x, at, 3 * sizeof(double));
    }
}

rdl_status rdli_view_check(const rdl_view *view, size_t vertex_count, const char *field, rdl_fault *fault)
{
    rdl_status status = check_shape(view->data, view->stride, view->format, field, fault);
    size_t stride = stride_of(view->stride, view->format);
    for (size_t v = 0; status == RDL_OK && v < vertex_count; v++) {
        double x[3];
        read_vertex(view->data, stride, view->format, v, x);
        if (!isfinite(x[0]) || !isfinite(x[1]) || !isfinite(x[2]))
            status = rdli_fault_set(fault, RDL_NOT_FINITE, field, v);
    }
    return status;
}

rdl_status rdli_output_check(const rdl_output_view *view, const char *field, rdl_fault *fault)
{
    return check_shape(view->data, view->stride, view->format, field, fault);
}

void rdli_view_read(const rdl_view *view, size_t vertex_count, double (*positions)[3])
{
    size_t stride = stride_of(view->stride, view->format);
    for (size_t v = 0; v < vertex_count; v++)
        read_vertex(view->data, stride, view->format, v, positions[v]);
}

void rdli_view_write(const rdl_output_view *view, size_t vertex_count, const double (*positions)[3])
{
    size_t stride = stride_of(view->stride, view->format);
    for (size_t v = 0; v < vertex_count; v++) {
        char *at = (char *)view->data + v * stride;
        if (view->format == RDL_FLOAT32) {
            float *f = (void *)at;
            for (int k = 0; k < 3; k++)
                f[k] = (float)positions[v][k];
        } else {
            memcpy(at, positions[v], 3 * sizeof(double));
        }
    }
}
