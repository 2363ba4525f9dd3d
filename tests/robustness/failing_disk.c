/* A disk that fails on demand: put before the C library with LD_PRELOAD.

   failing_disk(marker, kind, after, error, lasting) makes the `after`-th call of a kind (see KINDS,
   counted from 0) on a file whose path contains `marker` fail with `error`; `lasting` makes all
   calls of that kind after it fail as well. failing_disk(NULL, ...) ends it. failing_disk_hits()
   says how many calls failed. */

#define _GNU_SOURCE
#include <dlfcn.h>
#include <errno.h>
#include <fcntl.h>
#include <limits.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>
#include <sys/types.h>
#include <unistd.h>

enum { WRITES = 1, FLUSHES = 2, TRUNCATES = 4, UNLINKS = 8, OPENS = 16, LOCKS = 32, READS = 64 };

static char marker[256];
static int armed, wanted_kind, countdown, error_number, lasting, hits;

void failing_disk(const char *mark, int kind, int after, int error, int keep) {
    armed = mark != NULL;
    if (mark) strncpy(marker, mark, sizeof marker - 1);
    wanted_kind = kind; countdown = after; error_number = error; lasting = keep; hits = 0;
}

int failing_disk_hits(void) { return hits; }

static int fails(int kind, const char *path) {
    if (!armed || !(kind & wanted_kind) || !path || !strstr(path, marker)) return 0;
    if (countdown-- > 0) return 0;
    if (!lasting && hits) return 0;
    hits++;
    errno = error_number;
    return 1;
}

static int fails_at(int kind, int handle) {
    if (!armed || !(kind & wanted_kind)) return 0;
    char link[64], path[PATH_MAX];
    snprintf(link, sizeof link, "/proc/self/fd/%d", handle);
    ssize_t length = readlink(link, path, sizeof path - 1);
    if (length < 0) return 0;
    path[length] = 0;
    return fails(kind, path);
}

#define REAL(name) static __typeof__(&name) real; if (!real) real = dlsym(RTLD_NEXT, #name)

ssize_t write(int h, const void *b, size_t n) { REAL(write); return fails_at(WRITES, h) ? -1 : real(h, b, n); }
ssize_t pwrite(int h, const void *b, size_t n, off_t o) { REAL(pwrite); return fails_at(WRITES, h) ? -1 : real(h, b, n, o); }
ssize_t pwrite64(int h, const void *b, size_t n, off64_t o) { REAL(pwrite64); return fails_at(WRITES, h) ? -1 : real(h, b, n, o); }
ssize_t pread(int h, void *b, size_t n, off_t o) { REAL(pread); return fails_at(READS, h) ? -1 : real(h, b, n, o); }
ssize_t pread64(int h, void *b, size_t n, off64_t o) { REAL(pread64); return fails_at(READS, h) ? -1 : real(h, b, n, o); }
int fsync(int h) { REAL(fsync); return fails_at(FLUSHES, h) ? -1 : real(h); }
int fdatasync(int h) { REAL(fdatasync); return fails_at(FLUSHES, h) ? -1 : real(h); }
int ftruncate(int h, off_t n) { REAL(ftruncate); return fails_at(TRUNCATES, h) ? -1 : real(h, n); }
int ftruncate64(int h, off64_t n) { REAL(ftruncate64); return fails_at(TRUNCATES, h) ? -1 : real(h, n); }
int unlink(const char *p) { REAL(unlink); return fails(UNLINKS, p) ? -1 : real(p); }
int flock(int h, int w) { REAL(flock); return fails_at(LOCKS, h) ? -1 : real(h, w); }

static int mode_of(int flags, va_list rest) { return flags & O_CREAT ? va_arg(rest, int) : 0; }

int open(const char *p, int flags, ...) {
    REAL(open);
    va_list rest; va_start(rest, flags); int mode = mode_of(flags, rest); va_end(rest);
    return flags & (O_CREAT | O_WRONLY | O_RDWR) && fails(OPENS, p) ? -1 : real(p, flags, mode);
}
int open64(const char *p, int flags, ...) {
    REAL(open64);
    va_list rest; va_start(rest, flags); int mode = mode_of(flags, rest); va_end(rest);
    return flags & (O_CREAT | O_WRONLY | O_RDWR) && fails(OPENS, p) ? -1 : real(p, flags, mode);
}
int fcntl64(int h, int command, ...) {
    REAL(fcntl64);
    va_list rest; va_start(rest, command); void *more = va_arg(rest, void *); va_end(rest);
    return (command == F_SETLK || command == F_GETLK) && fails_at(LOCKS, h) ? -1 : real(h, command, more);
}
