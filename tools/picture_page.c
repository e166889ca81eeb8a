/* picture_page.c: a still's page: title, panels side by side, captions, legend. */
#include "picture.h"

enum { MARGIN = 28, HEADER = 92, HEADING = 40, CAPTION = 34, LEGEND = 52 };

static void say(cairo_t *pen, double x, double y, double size, int bold, double grey, const char *text)
{
    cairo_select_font_face(pen, "sans-serif", CAIRO_FONT_SLANT_NORMAL,
                           bold ? CAIRO_FONT_WEIGHT_BOLD : CAIRO_FONT_WEIGHT_NORMAL);
    cairo_set_font_size(pen, size);
    cairo_set_source_rgb(pen, grey, grey, grey);
    cairo_move_to(pen, x, y);
    cairo_show_text(pen, text);
}

static void draw_panel(cairo_t *pen, const picture_panel *panel, double x, double y)
{
    double width = cairo_image_surface_get_width(panel->image), height = cairo_image_surface_get_height(panel->image);
    say(pen, x, y + 26, 20, 1, 0.12, panel->heading);
    cairo_set_source_surface(pen, panel->image, x, y + HEADING);
    cairo_paint(pen);
    cairo_rectangle(pen, x + 0.5, y + HEADING + 0.5, width - 1, height - 1);
    cairo_set_source_rgb(pen, 0.55, 0.57, 0.58);
    cairo_set_line_width(pen, 1);
    cairo_stroke(pen);
    if (panel->caption)
        say(pen, x, y + HEADING + height + 24, 16, 0, 0.25, panel->caption);
}

static void draw_legend(cairo_t *pen, const picture_key keys[], size_t count, double y)
{
    double x = MARGIN;
    for (size_t k = 0; k < count; k++) {
        cairo_text_extents_t extents;
        cairo_arc(pen, x + 7, y - 6, 6, 0, 6.2831853);
        cairo_set_source_rgb(pen, (double)keys[k].colour[0], (double)keys[k].colour[1], (double)keys[k].colour[2]);
        cairo_fill(pen);
        say(pen, x + 22, y, 16, 0, 0.2, keys[k].text);
        cairo_text_extents(pen, keys[k].text, &extents);
        x += extents.x_advance + 60;
    }
}

int picture_page(const char *path, const char *title, const char *subtitle, const picture_panel panels[],
                 size_t panel_count, const picture_key keys[], size_t key_count)
{
    int width = MARGIN, height = 0;
    for (size_t p = 0; p < panel_count; p++) {
        int tall = cairo_image_surface_get_height(panels[p].image);
        width += cairo_image_surface_get_width(panels[p].image) + MARGIN;
        height = tall > height ? tall : height;
    }
    height += HEADER + HEADING + CAPTION + (key_count ? LEGEND : MARGIN);
    cairo_surface_t *page = cairo_image_surface_create(CAIRO_FORMAT_RGB24, width, height);
    cairo_t *pen = cairo_create(page);
    cairo_set_source_rgb(pen, 0.975, 0.973, 0.968);
    cairo_paint(pen);
    say(pen, MARGIN, 46, 28, 1, 0.08, title);
    say(pen, MARGIN, 76, 17, 0, 0.3, subtitle);
    double x = MARGIN;
    for (size_t p = 0; p < panel_count; p++) {
        draw_panel(pen, &panels[p], x, HEADER);
        x += cairo_image_surface_get_width(panels[p].image) + MARGIN;
    }
    draw_legend(pen, keys, key_count, height - 20);
    int done = cairo_status(pen) == CAIRO_STATUS_SUCCESS && cairo_surface_write_to_png(page, path) == CAIRO_STATUS_SUCCESS;
    cairo_destroy(pen);
    cairo_surface_destroy(page);
    return done;
}
