/* shot/read_table.c: opening and reading single tables and attributes of an untrusted file. */
#include "shot/read.h"

enum {
    PACKED_MAX = 4096,    /* deflate packs at most 1032:1, so more bytes than this per byte of file are a lie */
    SCALED_MAX = 1 << 20, /* the scale-offset filter stores a constant chunk in a few bytes */
    SLACK = 1 << 20,      /* small tables may live in fill values alone */
    TEXT_MAX = 4096
};

static rdl_status bad(rdl_fault *fault, const char *field, uint64_t index)
{
    return rdli_fault_set(fault, RDL_BAD_FILE, field, index);
}

hid_t rdli_object_open(hid_t parent, const char *name, H5I_type_t kind, bool *present)
{
    H5L_info_t link;
    *present = H5Lexists(parent, name, H5P_DEFAULT) != 0;
    /* Soft, external and user-defined links could lead to any file of the machine. */
    if (!*present || H5Lget_info(parent, name, &link, H5P_DEFAULT) < 0 || link.type != H5L_TYPE_HARD)
        return H5I_INVALID_HID;
    hid_t object = H5Oopen(parent, name, H5P_DEFAULT);
    if (object >= 0 && H5Iget_type(object) != kind) {
        H5Oclose(object);
        object = H5I_INVALID_HID;
    }
    return object;
}

/* Only filters that every HDF5 brings: others would make it look for plug-ins, that is, run code that the file names.
 */
static bool filters_are_standard(hid_t plan, bool *scaled)
{
    int count = H5Pget_nfilters(plan);
    for (int i = 0; i < count; i++) {
        unsigned flags = 0, config = 0, values[32];
        size_t value_count = 32;
        H5Z_filter_t filter = H5Pget_filter2(plan, (unsigned)i, &flags, &value_count, values, 0, NULL, &config);
        if (filter < H5Z_FILTER_DEFLATE || filter > H5Z_FILTER_SCALEOFFSET || H5Zfilter_avail(filter) <= 0)
            return false;
        *scaled = *scaled || filter == H5Z_FILTER_SCALEOFFSET || filter == H5Z_FILTER_NBIT;
    }
    return count >= 0;
}

static bool storage_is_sound(const rdl_shot *shot, hid_t set, int rank, uint64_t bytes, size_t item)
{
    hid_t plan = H5Dget_create_plist(set);
    if (plan < 0)
        return false;
    bool scaled = false;
    H5D_layout_t layout = H5Pget_layout(plan);
    bool sound = (layout == H5D_COMPACT || layout == H5D_CONTIGUOUS || layout == H5D_CHUNKED) &&
                 H5Pget_external_count(plan) == 0 && filters_are_standard(plan, &scaled);
    uint64_t most = shot->file_bytes * (uint64_t)(scaled ? SCALED_MAX : PACKED_MAX) + SLACK;
    hsize_t chunk[H5S_MAX_RANK] = {0};
    if (sound && layout == H5D_CHUNKED) {
        uint64_t chunk_bytes = item;
        sound = H5Pget_chunk(plan, H5S_MAX_RANK, chunk) == rank;
        for (int i = 0; sound && i < rank; i++) {
            sound = chunk[i] > 0 && chunk_bytes <= most / chunk[i];
            chunk_bytes *= chunk[i];
        }
    }
    H5Pclose(plan);
    return sound && bytes <= most;
}

/* A custom number type could place its fields anywhere; HDF5's conversion is only asked to take sane ones. */
static bool number_is_sane(hid_t type, H5T_class_t class)
{
    size_t size = H5Tget_size(type), precision = H5Tget_precision(type);
    int offset = H5Tget_offset(type);
    if (size == 0 || size > 16 || precision == 0 || offset < 0 || precision + (size_t)offset > 8 * size)
        return false;
    H5T_order_t order = H5Tget_order(type);
    if (size > 1 && order != H5T_ORDER_LE && order != H5T_ORDER_BE)
        return false;
    if (class == H5T_INTEGER)
        return size <= 8;
    size_t sign = 0, exponent = 0, exponent_bits = 0, mantissa = 0, mantissa_bits = 0;
    return H5Tget_fields(type, &sign, &exponent, &exponent_bits, &mantissa, &mantissa_bits) >= 0 &&
           exponent_bits >= 1 && exponent_bits <= 15 && mantissa_bits >= 1 && sign < 8 * size &&
           exponent + exponent_bits <= 8 * size && mantissa + mantissa_bits <= 8 * size;
}

static bool type_is_sound(hid_t set, H5T_class_t class, size_t *item)
{
    hid_t type = H5Dget_type(set);
    if (type < 0)
        return false;
    bool sound = H5Tget_class(type) == class || class == H5T_NO_CLASS;
    *item = H5Tget_size(type);
    if (sound && (class == H5T_INTEGER || class == H5T_FLOAT))
        sound = number_is_sane(type, class);
    H5Tclose(type);
    return sound && *item > 0;
}

/* Shape and plausible size. */
static rdl_status check_shape(rdl_shot *shot, hid_t set, const char *field, int rank, const uint64_t tail[2],
                              size_t item, uint64_t *rows, rdl_fault *fault)
{
    hid_t space = H5Dget_space(set);
    hsize_t dims[H5S_MAX_RANK] = {0};
    bool sound = space >= 0 && H5Sget_simple_extent_type(space) == H5S_SIMPLE &&
                 H5Sget_simple_extent_ndims(space) == rank && H5Sget_simple_extent_dims(space, dims, NULL) == rank;
    if (space >= 0)
        H5Sclose(space);
    if (!sound)
        return bad(fault, field, 0);
    uint64_t bytes = item;
    for (int i = 0; i < rank; i++) {
        if (i > 0 && tail[i - 1] != 0 && dims[i] != tail[i - 1])
            return bad(fault, field, dims[i]);
        if (dims[i] != 0 && bytes > UINT64_MAX / dims[i])
            return rdli_fault_set(fault, RDL_TOO_LARGE, field, dims[i]);
        bytes *= dims[i];
    }
    *rows = dims[0];
    return storage_is_sound(shot, set, rank, bytes, item) ? RDL_OK : bad(fault, field, dims[0]);
}

rdl_status rdli_table_open(rdl_shot *shot, const char *group, const char *name, const char *field, H5T_class_t class,
                           int rank, const uint64_t tail[2], rdli_table *table, rdl_fault *fault)
{
    bool present = false;
    table->id = H5I_INVALID_HID;
    table->rows = 0;
    hid_t folder = rdli_object_open(shot->file, group, H5I_GROUP, &present);
    if (folder < 0)
        return present ? bad(fault, group, 0) : RDL_OK;
    hid_t set = rdli_object_open(folder, name, H5I_DATASET, &present);
    H5Oclose(folder);
    if (set < 0)
        return present ? bad(fault, field, 0) : RDL_OK;
    size_t item = 0;
    rdl_status status = type_is_sound(set, class, &item)
                            ? check_shape(shot, set, field, rank, tail, item, &table->rows, fault)
                            : bad(fault, field, 0);
    if (status == RDL_OK)
        table->id = set;
    else
        H5Dclose(set);
    return status;
}

void rdli_table_close(rdli_table *table)
{
    if (table->id >= 0)
        H5Dclose(table->id);
    table->id = H5I_INVALID_HID;
}

uint64_t rdli_extent(hid_t set, int axis)
{
    hsize_t dims[H5S_MAX_RANK] = {0};
    hid_t space = H5Dget_space(set);
    if (space < 0)
        return 0;
    H5Sget_simple_extent_dims(space, dims, NULL);
    H5Sclose(space);
    return dims[axis];
}

rdl_status rdli_rows_read(hid_t set, hid_t type, uint64_t first, uint64_t count, void *data, const char *field,
                          rdl_fault *fault)
{
    hid_t space = H5Dget_space(set), room = H5I_INVALID_HID;
    hsize_t dims[H5S_MAX_RANK] = {0}, start[H5S_MAX_RANK] = {first};
    int rank = space >= 0 ? H5Sget_simple_extent_dims(space, dims, NULL) : -1;
    bool done = rank >= 1 && first <= dims[0] && count <= dims[0] - first;
    if (done && count > 0) {
        dims[0] = count;
        room = H5Screate_simple(rank, dims, NULL);
        done = room >= 0 && H5Sselect_hyperslab(space, H5S_SELECT_SET, start, NULL, dims, NULL) >= 0 &&
               H5Dread(set, type, room, space, H5P_DEFAULT, data) >= 0;
    }
    if (room >= 0)
        H5Sclose(room);
    if (space >= 0)
        H5Sclose(space);
    return done ? RDL_OK : bad(fault, field, first);
}

static bool attribute_is_single(hid_t attribute)
{
    hid_t space = H5Aget_space(attribute);
    bool single = space >= 0 && H5Sget_simple_extent_npoints(space) == 1;
    if (space >= 0)
        H5Sclose(space);
    return single;
}

rdl_status rdli_number_read(hid_t object, const char *name, const char *field, double *value, bool *found,
                            rdl_fault *fault)
{
    *found = H5Aexists(object, name) > 0;
    if (!*found)
        return RDL_OK;
    hid_t attribute = H5Aopen(object, name, H5P_DEFAULT);
    hid_t type = attribute >= 0 ? H5Aget_type(attribute) : H5I_INVALID_HID;
    H5T_class_t class = type >= 0 ? H5Tget_class(type) : H5T_NO_CLASS;
    double read = 0;
    bool done = (class == H5T_INTEGER || class == H5T_FLOAT) && number_is_sane(type, class) &&
                attribute_is_single(attribute) && H5Aread(attribute, H5T_NATIVE_DOUBLE, &read) >= 0;
    if (type >= 0)
        H5Tclose(type);
    if (attribute >= 0)
        H5Aclose(attribute);
    if (!done)
        return bad(fault, field, 0);
    *value = read;
    return RDL_OK;
}

/* Reads a text of fixed or variable length into room[TEXT_MAX]. */
static bool read_text(hid_t attribute, hid_t type, char *room)
{
    size_t size = H5Tget_size(type);
    hid_t wanted = H5Tcopy(H5T_C_S1);
    bool done = wanted >= 0 && H5Tset_cset(wanted, H5Tget_cset(type)) >= 0;
    if (done && H5Tis_variable_str(type) > 0) {
        char *text = NULL;
        done = H5Tset_size(wanted, H5T_VARIABLE) >= 0 && H5Aread(attribute, wanted, &text) >= 0;
        if (done && text != NULL)
            memcpy(room, text, strnlen(text, TEXT_MAX - 1));
        if (text != NULL)
            H5free_memory(text);
    } else if (done) {
        done = size < TEXT_MAX && H5Tset_size(wanted, size + 1) >= 0 && H5Aread(attribute, wanted, room) >= 0;
    }
    if (wanted >= 0)
        H5Tclose(wanted);
    return done;
}

rdl_status rdli_text_read(rdl_shot *shot, hid_t object, const char *name, int room, const char **text, rdl_fault *fault)
{
    *text = NULL;
    if (H5Aexists(object, name) <= 0)
        return RDL_OK;
    if (!rdli_room_reserve(&shot->memory, &shot->rooms[room], TEXT_MAX, 1, false))
        return RDL_NO_MEMORY;
    char *data = shot->rooms[room].data;
    memset(data, 0, TEXT_MAX);
    hid_t attribute = H5Aopen(object, name, H5P_DEFAULT);
    hid_t type = attribute >= 0 ? H5Aget_type(attribute) : H5I_INVALID_HID;
    bool done = type >= 0 && H5Tget_class(type) == H5T_STRING && attribute_is_single(attribute) &&
                read_text(attribute, type, data) && rdli_is_utf8(data, strlen(data));
    if (type >= 0)
        H5Tclose(type);
    if (attribute >= 0)
        H5Aclose(attribute);
    if (!done)
        return bad(fault, name, 0);
    *text = data;
    return RDL_OK;
}

bool rdli_is_utf8(const char *text, size_t bytes)
{
    const unsigned char *s = (const unsigned char *)text;
    for (size_t i = 0; i < bytes;) {
        unsigned char lead = s[i];
        size_t more = lead < 0x80 ? 0 : lead >= 0xc2 && lead < 0xe0 ? 1 : lead >= 0xe0 && lead < 0xf0 ? 2 : 3;
        if ((lead >= 0x80 && lead < 0xc2) || lead > 0xf4 || more >= bytes - i)
            return false;
        for (size_t k = 1; k <= more; k++)
            if ((s[i + k] & 0xc0) != 0x80)
                return false;
        /* Overlong forms, surrogates, and what lies beyond the last code point. */
        if ((lead == 0xe0 && s[i + 1] < 0xa0) || (lead == 0xed && s[i + 1] > 0x9f) ||
            (lead == 0xf0 && s[i + 1] < 0x90) || (lead == 0xf4 && s[i + 1] > 0x8f))
            return false;
        i += more + 1;
    }
    return true;
}
