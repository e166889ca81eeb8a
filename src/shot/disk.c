/* shot/disk.c: see disk.h. Plain POSIX reads and writes below HDF5's virtual file layer. */
#include "shot/disk.h"

#include <H5FDpublic.h>
#include <errno.h>
#include <fcntl.h>
#include <stdlib.h>
#include <unistd.h>

typedef struct disk_file {
    H5FD_t head; /* HDF5's part, first */
    int file;
    haddr_t end_of_space, end_of_file;
    bool *refused;
} disk_file;

#define ADDRESS_MAX ((haddr_t)INT64_MAX)

static H5FD_t *disk_open(const char *name, unsigned flags, hid_t access, haddr_t most)
{
    const void *info = H5Pget_driver_info(access);
    (void)most;
    if (info == NULL || (flags & H5F_ACC_RDWR) == 0)
        return NULL;
    disk_file *disk = calloc(1, sizeof *disk); /* freed by HDF5's close call below; its layer has no hook for memory */
    if (disk == NULL)
        return NULL;
    memcpy(&disk->refused, info, sizeof disk->refused);
    disk->file = open(name, O_RDWR | O_CLOEXEC | ((flags & H5F_ACC_TRUNC) != 0 ? O_TRUNC : 0));
    off_t end = disk->file >= 0 ? lseek(disk->file, 0, SEEK_END) : -1;
    if (end < 0) {
        if (disk->file >= 0)
            close(disk->file);
        free(disk);
        return NULL;
    }
    disk->end_of_file = (haddr_t)end;
    return &disk->head;
}

static herr_t disk_close(H5FD_t *head)
{
    disk_file *disk = (disk_file *)head;
    if (close(disk->file) != 0)
        *disk->refused = true;
    free(disk);
    return 0;
}

static herr_t disk_query(const H5FD_t *head, unsigned long *flags)
{
    (void)head;
    *flags = H5FD_FEAT_AGGREGATE_METADATA | H5FD_FEAT_ACCUMULATE_METADATA | H5FD_FEAT_DATA_SIEVE |
             H5FD_FEAT_AGGREGATE_SMALLDATA | H5FD_FEAT_SUPPORTS_SWMR_IO | H5FD_FEAT_DEFAULT_VFD_COMPATIBLE;
    return 0;
}

static haddr_t disk_get_space(const H5FD_t *head, H5FD_mem_t type)
{
    (void)type;
    return ((const disk_file *)head)->end_of_space;
}

static herr_t disk_set_space(H5FD_t *head, H5FD_mem_t type, haddr_t address)
{
    (void)type;
    ((disk_file *)head)->end_of_space = address;
    return 0;
}

static haddr_t disk_get_end(const H5FD_t *head, H5FD_mem_t type)
{
    (void)type;
    return ((const disk_file *)head)->end_of_file;
}

/* Bytes beyond the end of the file read as 0, as HDF5 expects. */
static herr_t disk_read(H5FD_t *head, H5FD_mem_t type, hid_t transfer, haddr_t address, size_t size, void *buffer)
{
    disk_file *disk = (disk_file *)head;
    char *next = buffer;
    (void)type;
    (void)transfer;
    if (address > ADDRESS_MAX || size > ADDRESS_MAX - address)
        return -1;
    while (size > 0) {
        ssize_t done = pread(disk->file, next, size, (off_t)address);
        if (done < 0 && errno == EINTR)
            continue;
        if (done < 0)
            return -1;
        if (done == 0) {
            memset(next, 0, size);
            break;
        }
        next += done;
        address += (haddr_t)done;
        size -= (size_t)done;
    }
    return 0;
}

static herr_t disk_write(H5FD_t *head, H5FD_mem_t type, hid_t transfer, haddr_t address, size_t size,
                         const void *buffer)
{
    disk_file *disk = (disk_file *)head;
    const char *next = buffer;
    (void)type;
    (void)transfer;
    if (address > ADDRESS_MAX || size > ADDRESS_MAX - address)
        return -1;
    haddr_t end = address + size;
    while (size > 0 && !*disk->refused) {
        ssize_t done = pwrite(disk->file, next, size, (off_t)address);
        if (done < 0 && errno == EINTR)
            continue;
        if (done <= 0) {
            *disk->refused = true;
            break;
        }
        next += done;
        address += (haddr_t)done;
        size -= (size_t)done;
    }
    if (end > disk->end_of_file)
        disk->end_of_file = end;
    return 0;
}

static herr_t disk_truncate(H5FD_t *head, hid_t transfer, hbool_t closing)
{
    disk_file *disk = (disk_file *)head;
    (void)transfer;
    (void)closing;
    if (disk->end_of_space == disk->end_of_file)
        return 0;
    if (!*disk->refused && ftruncate(disk->file, (off_t)disk->end_of_space) != 0)
        *disk->refused = true;
    disk->end_of_file = disk->end_of_space;
    return 0;
}

/* HDF5 writes its mark of an open writer only for drivers that can lock, and readers rely on that mark. */
static herr_t disk_lock(H5FD_t *head, hbool_t exclusive)
{
    (void)head;
    (void)exclusive;
    return 0;
}

static herr_t disk_unlock(H5FD_t *head)
{
    (void)head;
    return 0;
}

static const H5FD_class_t disk_class = {
    .name = "raddle_disk",
    .maxaddr = ADDRESS_MAX,
    .fc_degree = H5F_CLOSE_STRONG,
    .fapl_size = sizeof(bool *),
    .open = disk_open,
    .close = disk_close,
    .query = disk_query,
    .get_eoa = disk_get_space,
    .set_eoa = disk_set_space,
    .get_eof = disk_get_end,
    .read = disk_read,
    .write = disk_write,
    .truncate = disk_truncate,
    .lock = disk_lock,
    .unlock = disk_unlock,
    .fl_map = H5FD_FLMAP_DICHOTOMY,
};

bool rdli_disk_use(hid_t access, bool *refused, hid_t *driver)
{
    *driver = H5FDregister(&disk_class);
    return *driver >= 0 && H5Pset_driver(access, *driver, &refused) >= 0;
}
