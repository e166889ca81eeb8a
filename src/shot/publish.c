/* shot/publish.c: see publish.h. */
#define _GNU_SOURCE /* renameat2: the one call that renames and refuses to overwrite in one step */
#include "shot/publish.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <sys/stat.h>
#include <unistd.h>

rdl_status rdli_publish_claim(const char *path, bool replace)
{
    if (replace && unlink(path) != 0 && errno != ENOENT)
        return errno == ENOTDIR ? RDL_NO_FILE : RDL_WRITE_FAILED;
    int file = open(path, O_RDWR | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
    if (file < 0)
        return errno == EEXIST ? RDL_FILE_EXISTS : errno == ENOENT || errno == ENOTDIR ? RDL_NO_FILE : RDL_WRITE_FAILED;
    close(file);
    return RDL_OK;
}

bool rdli_publish_exists(const char *path)
{
    struct stat info;
    return lstat(path, &info) == 0;
}

static bool sync_path(const char *path, int flags)
{
    int file = open(path, flags | O_CLOEXEC);
    if (file < 0)
        return false;
    /* Some file systems cannot sync a folder or a special file: that is not a lost write. */
    bool done = fsync(file) == 0 || errno == EINVAL || errno == ENOTSUP;
    return close(file) == 0 && done;
}

/* The folder's entry is made durable as far as the file system can; the data already are. */
static void sync_folder_of(const char *path)
{
    char folder[4096];
    size_t length = strlen(path);
    while (length > 0 && path[length - 1] != '/')
        length--;
    if (length >= sizeof folder)
        return;
    memcpy(folder, path, length);
    folder[length] = '\0';
    (void)sync_path(length == 0 ? "." : folder, O_RDONLY | O_DIRECTORY);
}

static bool rename_new(const char *from, const char *to)
{
    if (renameat2(AT_FDCWD, from, AT_FDCWD, to, RENAME_NOREPLACE) == 0)
        return true;
    if (errno == EEXIST || (errno != EINVAL && errno != ENOSYS))
        return false;
    /* A file system without that call: a second name, which also refuses to overwrite, then drop the first. */
    return link(from, to) == 0 && unlink(from) == 0;
}

rdl_status rdli_publish_rename(const char *from, const char *to, bool replace)
{
    if (!sync_path(from, O_RDONLY))
        return RDL_WRITE_FAILED;
    bool done = replace ? rename(from, to) == 0 : rename_new(from, to);
    if (!done)
        return errno == EEXIST ? RDL_FILE_EXISTS : RDL_WRITE_FAILED;
    sync_folder_of(to);
    return RDL_OK;
}
