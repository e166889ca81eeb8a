/* shot/read_scene.c: /parts, /mesh, /rules and /settings of an untrusted file. */
#include "shot/read.h"
#include "shot/scene.h"

enum { ROWS_MAX = 0x7fffffff };

static rdl_status missing(rdl_fault *fault, const char *field)
{
    return rdli_fault_set(fault, RDL_BAD_FILE, field, 0);
}

static void *room_for(rdl_shot *shot, int room, uint64_t count, size_t item)
{
    if (count > ROWS_MAX || !rdli_room_reserve(&shot->memory, &shot->rooms[room], (size_t)count, item, false))
        return NULL;
    return shot->rooms[room].data;
}

/* A table of whole numbers of any width and byte order, as rows of `width` 32-bit numbers. Read as signed 64-bit first,
 * since HDF5's conversion would silently clip what does not fit. */
static rdl_status read_whole(rdl_shot *shot, const char *group, const char *name, const char *field, size_t width,
                             int room, uint64_t *rows, bool *present, rdl_fault *fault)
{
    rdli_table table;
    const uint64_t tail[2] = {width, 0};
    rdl_status status = rdli_table_open(shot, group, name, field, H5T_INTEGER, width > 1 ? 2 : 1, tail, &table, fault);
    *present = table.id >= 0;
    *rows = table.rows;
    if (status != RDL_OK || !*present)
        return status;
    if (*rows > ROWS_MAX)
        status = rdli_fault_set(fault, RDL_TOO_LARGE, field, *rows);
    uint64_t count = *rows * width;
    int64_t *wide = NULL;
    uint32_t *narrow = NULL;
    if (status == RDL_OK && count > 0) {
        wide = room_for(shot, RDLI_ROOM_SCRATCH, *rows, width * sizeof *wide);
        narrow = room_for(shot, room, *rows, width * sizeof *narrow);
        status = wide != NULL && narrow != NULL
                     ? rdli_rows_read(table.id, H5T_NATIVE_INT64, 0, *rows, wide, field, fault)
                     : RDL_NO_MEMORY;
    }
    for (uint64_t i = 0; status == RDL_OK && i < count; i++) {
        if (wide[i] < 0 || wide[i] > ROWS_MAX)
            status = rdli_fault_set(fault, RDL_OUT_OF_RANGE, field, i / width);
        else
            narrow[i] = (uint32_t)wide[i];
    }
    rdli_table_close(&table);
    return status;
}

static rdl_status read_real(rdl_shot *shot, const char *group, const char *name, const char *field, size_t width,
                            int room, uint64_t *rows, bool *present, rdl_fault *fault)
{
    rdli_table table;
    const uint64_t tail[2] = {width, 0};
    rdl_status status = rdli_table_open(shot, group, name, field, H5T_FLOAT, width > 1 ? 2 : 1, tail, &table, fault);
    *present = table.id >= 0;
    *rows = table.rows;
    if (status == RDL_OK && *rows > ROWS_MAX)
        status = rdli_fault_set(fault, RDL_TOO_LARGE, field, *rows);
    if (status == RDL_OK && *present && *rows > 0) {
        double *data = room_for(shot, room, *rows, width * sizeof *data);
        status =
            data != NULL ? rdli_rows_read(table.id, H5T_NATIVE_DOUBLE, 0, *rows, data, field, fault) : RDL_NO_MEMORY;
    }
    rdli_table_close(&table);
    return status;
}

/* HDF5 allocates each text of variable length itself; given a fixed length it copies into our room. */
static rdl_status read_texts(rdl_shot *shot, const rdli_table *table, char **texts, size_t *stride, rdl_fault *fault)
{
    hid_t type = H5Dget_type(table->id), wanted = H5Tcopy(H5T_C_S1);
    bool variable = type >= 0 && H5Tis_variable_str(type) > 0;
    size_t longest = variable ? 0 : H5Tget_size(type);
    char **each = NULL;
    rdl_status status = type >= 0 && wanted >= 0 && H5Tset_cset(wanted, H5Tget_cset(type)) >= 0 &&
                                H5Tset_size(wanted, variable ? H5T_VARIABLE : longest + 1) >= 0
                            ? RDL_OK
                            : rdli_fault_set(fault, RDL_BAD_FILE, "parts/name", 0);
    if (status == RDL_OK && variable) {
        each = room_for(shot, RDLI_ROOM_SCRATCH, table->rows, sizeof *each);
        if (each == NULL)
            status = RDL_NO_MEMORY;
        else
            memset(each, 0, table->rows * sizeof *each);
        if (status == RDL_OK)
            status = rdli_rows_read(table->id, wanted, 0, table->rows, each, "parts/name", fault);
        for (uint64_t p = 0; status == RDL_OK && p < table->rows; p++)
            if (each[p] != NULL && strlen(each[p]) > longest)
                longest = strlen(each[p]);
    }
    *stride = longest + 1;
    *texts = NULL;
    if (status == RDL_OK && (longest > SIZE_MAX / 4 / table->rows ||
                             (*texts = room_for(shot, RDLI_ROOM_NAMES, table->rows, *stride)) == NULL))
        status = RDL_NO_MEMORY;
    if (status == RDL_OK)
        memset(*texts, 0, table->rows * *stride);
    if (status == RDL_OK && !variable)
        status = rdli_rows_read(table->id, wanted, 0, table->rows, *texts, "parts/name", fault);
    for (uint64_t p = 0; each != NULL && p < table->rows; p++) {
        if (each[p] != NULL && status == RDL_OK)
            memcpy(*texts + p * *stride, each[p], strlen(each[p]));
        H5free_memory(each[p]);
    }
    if (wanted >= 0)
        H5Tclose(wanted);
    if (type >= 0)
        H5Tclose(type);
    return status;
}

static rdl_status read_names(rdl_shot *shot, bool *present, rdl_fault *fault)
{
    rdli_table table;
    const uint64_t tail[2] = {0, 0};
    rdl_status status = rdli_table_open(shot, "parts", "name", "parts/name", H5T_STRING, 1, tail, &table, fault);
    *present = table.id >= 0;
    if (status != RDL_OK || !*present)
        return status;
    if (table.rows == 0 || table.rows > ROWS_MAX)
        status = rdli_fault_set(fault, RDL_BAD_FILE, "parts/name", table.rows);
    char *texts = NULL;
    size_t stride = 0;
    if (status == RDL_OK)
        status = read_texts(shot, &table, &texts, &stride, fault);
    rdl_part *parts = status == RDL_OK ? room_for(shot, RDLI_ROOM_PARTS, table.rows, sizeof *parts) : NULL;
    if (status == RDL_OK && parts == NULL)
        status = RDL_NO_MEMORY;
    for (uint64_t p = 0; status == RDL_OK && p < table.rows; p++) {
        parts[p] = (rdl_part){.name = texts + p * stride, .kind = RDL_BODY};
        if (!rdli_is_utf8(parts[p].name, strlen(parts[p].name)))
            status = rdli_fault_set(fault, RDL_BAD_FILE, "parts/name", p);
    }
    rdli_table_close(&table);
    shot->scene.parts = parts;
    shot->scene.part_count = (size_t)table.rows;
    return status;
}

/* One column of /parts; a column that may be absent leaves its zeros. */
static rdl_status read_part_column(rdl_shot *shot, const char *name, const char *field, bool needed, size_t offset,
                                   rdl_fault *fault)
{
    uint64_t rows = 0;
    bool present = false;
    bool whole = strcmp(name, "kind") == 0;
    rdl_status status = whole ? read_whole(shot, "parts", name, field, 1, RDLI_ROOM_MEMORY, &rows, &present, fault)
                              : read_real(shot, "parts", name, field, 1, RDLI_ROOM_MEMORY, &rows, &present, fault);
    if (status != RDL_OK || (!present && !needed))
        return status;
    if (!present || rows != shot->scene.part_count)
        return rdli_fault_set(fault, RDL_BAD_FILE, field, rows);
    for (size_t p = 0; p < rows; p++) {
        char *part = (char *)shot->rooms[RDLI_ROOM_PARTS].data + p * sizeof(rdl_part);
        if (whole) {
            uint32_t kind = ((const uint32_t *)shot->rooms[RDLI_ROOM_MEMORY].data)[p];
            int value = (int)kind;
            memcpy(part + offset, &value, sizeof value);
        } else {
            memcpy(part + offset, (const double *)shot->rooms[RDLI_ROOM_MEMORY].data + p, sizeof(double));
        }
    }
    return RDL_OK;
}

/* A file without /parts (a bare sequence of poses) is one part, of the kind that its elements make it. */
static rdl_status read_parts(rdl_shot *shot, rdl_fault *fault)
{
    bool named = false;
    rdl_status status = read_names(shot, &named, fault);
    if (status != RDL_OK)
        return status;
    if (named) {
        status = read_part_column(shot, "kind", "parts/kind", true, offsetof(rdl_part, kind), fault);
        if (status == RDL_OK)
            status = read_part_column(shot, "half_thickness", "parts/half_thickness", true,
                                      offsetof(rdl_part, half_thickness), fault);
        if (status == RDL_OK)
            status = read_part_column(shot, "friction", "parts/friction", false, offsetof(rdl_part, friction), fault);
        return status;
    }
    if (shot->scene.segment_count > 0 && shot->scene.triangle_count > 0)
        return missing(fault, "parts/name");
    rdl_part *part = room_for(shot, RDLI_ROOM_PARTS, 1, sizeof *part);
    if (part == NULL)
        return RDL_NO_MEMORY;
    *part = (rdl_part){.name = "all", .kind = shot->scene.segment_count > 0 ? RDL_STRANDS : RDL_CLOTH};
    shot->scene.parts = part;
    shot->scene.part_count = 1;
    return RDL_OK;
}

/* Checks a per-vertex table against the vertex count, which the first of them sets. */
static rdl_status agree(rdl_shot *shot, const char *field, uint64_t rows, rdl_fault *fault)
{
    if (rows == 0 || (shot->scene.vertex_count != 0 && shot->scene.vertex_count != rows))
        return rdli_fault_set(fault, RDL_BAD_FILE, field, rows);
    if (rows > ROWS_MAX)
        return rdli_fault_set(fault, RDL_TOO_LARGE, field, rows);
    shot->scene.vertex_count = (size_t)rows;
    return RDL_OK;
}

static rdl_status read_mesh(rdl_shot *shot, rdl_fault *fault)
{
    uint64_t rows = 0;
    bool present = false;
    rdl_scene *scene = &shot->scene;
    rdl_status status = read_whole(shot, "mesh", "part", "mesh/part", 1, RDLI_ROOM_VERTEX_PART, &rows, &present, fault);
    if (status == RDL_OK && present && (status = agree(shot, "mesh/part", rows, fault)) == RDL_OK)
        scene->vertex_part = shot->rooms[RDLI_ROOM_VERTEX_PART].data;
    if (status == RDL_OK)
        status = read_real(shot, "mesh", "mass", "mesh/mass", 1, RDLI_ROOM_MASS, &rows, &present, fault);
    if (status == RDL_OK && present && (status = agree(shot, "mesh/mass", rows, fault)) == RDL_OK)
        scene->mass = shot->rooms[RDLI_ROOM_MASS].data;
    if (status == RDL_OK)
        status = read_real(shot, "mesh", "half_thickness", "mesh/half_thickness", 1, RDLI_ROOM_HALF_THICKNESS, &rows,
                           &present, fault);
    if (status == RDL_OK && present && (status = agree(shot, "mesh/half_thickness", rows, fault)) == RDL_OK)
        scene->half_thickness = shot->rooms[RDLI_ROOM_HALF_THICKNESS].data;
    if (status == RDL_OK)
        status = read_whole(shot, "mesh", "segments", "mesh/segments", 2, RDLI_ROOM_SEGMENTS, &rows, &present, fault);
    if (status == RDL_OK) {
        scene->segment_count = (size_t)rows;
        scene->segments = (const uint32_t(*)[2])shot->rooms[RDLI_ROOM_SEGMENTS].data;
        status =
            read_whole(shot, "mesh", "triangles", "mesh/triangles", 3, RDLI_ROOM_TRIANGLES, &rows, &present, fault);
    }
    if (status == RDL_OK) {
        scene->triangle_count = (size_t)rows;
        scene->triangles = (const uint32_t(*)[3])shot->rooms[RDLI_ROOM_TRIANGLES].data;
        if (scene->segment_count + scene->triangle_count == 0)
            status = missing(fault, "mesh/triangles");
    }
    return status;
}

static rdl_status read_rules(rdl_shot *shot, rdl_fault *fault)
{
    uint64_t rows = 0;
    bool present = false;
    rdl_scene *scene = &shot->scene;
    rdl_status status =
        read_whole(shot, "rules", "muted_parts", "rules/muted_parts", 2, RDLI_ROOM_MUTED, &rows, &present, fault);
    if (status != RDL_OK)
        return status;
    scene->muted_count = (size_t)rows;
    scene->muted_parts = (const uint32_t(*)[2])shot->rooms[RDLI_ROOM_MUTED].data;
    status =
        read_whole(shot, "rules", "attachments", "rules/attachments", 2, RDLI_ROOM_ATTACHMENTS, &rows, &present, fault);
    if (status != RDL_OK)
        return status;
    scene->attachment_count = (size_t)rows;
    scene->attachments = (const uint32_t(*)[2])shot->rooms[RDLI_ROOM_ATTACHMENTS].data;
    status =
        read_real(shot, "rules", "pair_friction", "rules/pair_friction", 3, RDLI_ROOM_MEMORY, &rows, &present, fault);
    rdl_pair_friction *pairs = NULL;
    if (status == RDL_OK && rows > 0 && (pairs = room_for(shot, RDLI_ROOM_PAIR_FRICTION, rows, sizeof *pairs)) == NULL)
        status = RDL_NO_MEMORY;
    const double *numbers = shot->rooms[RDLI_ROOM_MEMORY].data;
    for (size_t k = 0; status == RDL_OK && k < rows; k++) {
        for (size_t i = 0; status == RDL_OK && i < 2; i++) {
            double part = numbers[3 * k + i];
            if (!(part >= 0 && part <= ROWS_MAX && part == floor(part)))
                status = rdli_fault_set(fault, RDL_OUT_OF_RANGE, "rules/pair_friction", k);
            else
                pairs[k].part[i] = (uint32_t)part;
        }
        pairs[k].friction = numbers[3 * k + 2];
    }
    scene->pair_friction = pairs;
    scene->pair_friction_count = (size_t)rows;
    return status;
}

/* What a bare sequence of poses leaves out; a shot of steps must have it. */
static rdl_status fill_in(rdl_shot *shot, rdl_fault *fault)
{
    rdl_scene *scene = &shot->scene;
    bool steps = (shot->info.contents & (RDL_SHOT_START | RDL_SHOT_PROPOSED)) != 0;
    if (steps && (scene->mass == NULL || scene->vertex_part == NULL))
        return missing(fault, scene->vertex_part == NULL ? "mesh/part" : "mesh/mass");
    size_t count = scene->vertex_count;
    if (scene->vertex_part == NULL) {
        if (scene->part_count != 1)
            return missing(fault, "mesh/part");
        uint32_t *part = room_for(shot, RDLI_ROOM_VERTEX_PART, count, sizeof *part);
        if (part == NULL)
            return RDL_NO_MEMORY;
        memset(part, 0, count * sizeof *part);
        scene->vertex_part = part;
    }
    shot->info.has_mass = scene->mass != NULL;
    if (scene->mass == NULL) {
        double *mass = room_for(shot, RDLI_ROOM_MASS, count, sizeof *mass);
        if (mass == NULL)
            return RDL_NO_MEMORY;
        for (size_t v = 0; v < count; v++) {
            uint32_t part = scene->vertex_part[v];
            mass[v] = part < scene->part_count && scene->parts[part].kind == RDL_BODY ? INFINITY : 1;
        }
        scene->mass = mass;
    }
    return RDL_OK;
}

rdl_status rdli_scene_read(rdl_shot *shot, rdl_fault *fault)
{
    shot->scene.size = sizeof shot->scene;
    rdl_status status = read_mesh(shot, fault);
    if (status == RDL_OK)
        status = read_parts(shot, fault);
    if (status == RDL_OK)
        status = read_rules(shot, fault);
    if (status == RDL_OK)
        status = rdli_frames_open(shot, fault);
    if (status == RDL_OK)
        status = fill_in(shot, fault);
    return status == RDL_OK ? rdli_shot_scene_check(&shot->scene, fault) : status;
}

static rdl_status read_setting(rdl_shot *shot, hid_t group, const char *name, rdl_fault *fault)
{
    size_t count = 0, row = 0;
    const rdl_setting_info *table = rdl_settings_table(&count);
    while (row < count && strcmp(table[row].name, name) != 0)
        row++;
    if (row == count) {
        rdli_room *room = &shot->rooms[RDLI_ROOM_UNKNOWN_SETTING];
        if (shot->info.unknown_setting == NULL) {
            if (!rdli_room_reserve(&shot->memory, room, strlen(name) + 1, 1, false))
                return RDL_NO_MEMORY;
            memcpy(room->data, name, strlen(name) + 1);
            shot->info.unknown_setting = room->data;
        }
        return RDL_OK;
    }
    double value = 0;
    bool found = false;
    rdl_status status = rdli_number_read(group, name, "settings", &value, &found, fault);
    if (status == RDL_OK && found)
        memcpy((char *)&shot->info.settings + table[row].offset, &value, sizeof value);
    return status;
}

typedef struct settings_walk {
    rdl_shot *shot;
    rdl_status status;
    rdl_fault *fault;
} settings_walk;

static herr_t visit_setting(hid_t group, const char *name, const H5A_info_t *info, void *data)
{
    settings_walk *walk = data;
    (void)info;
    if (strcmp(name, "engine_version") != 0)
        walk->status = read_setting(walk->shot, group, name, walk->fault);
    return walk->status == RDL_OK ? 0 : -1;
}

rdl_status rdli_settings_read(rdl_shot *shot, rdl_fault *fault)
{
    bool present = false;
    rdl_settings_default(&shot->info.settings);
    hid_t group = rdli_object_open(shot->file, "settings", H5I_GROUP, &present);
    if (group < 0)
        return present ? rdli_fault_set(fault, RDL_BAD_FILE, "settings", 0) : RDL_OK;
    shot->info.has_settings = 1;
    rdl_status status =
        rdli_text_read(shot, group, "engine_version", RDLI_ROOM_ENGINE_VERSION, &shot->info.engine_version, fault);
    settings_walk walk = {shot, RDL_OK, fault};
    if (status == RDL_OK && H5Aiterate2(group, H5_INDEX_NAME, H5_ITER_INC, NULL, visit_setting, &walk) < 0)
        status = walk.status != RDL_OK ? walk.status : rdli_fault_set(fault, RDL_BAD_FILE, "settings", 0);
    H5Oclose(group);
    return status == RDL_OK ? rdl_settings_check(&shot->info.settings, fault) : status;
}
