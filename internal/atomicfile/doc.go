// Package atomicfile replaces files so that a reader sees the old content or the new, never a part, and locks folders against a
// second run by mistake.
//
// # Writing
//
// Write fills a temporary file in the folder of its target (never elsewhere: a rename works only within a file system, and a large
// state must not land in a small /tmp), syncs it to the disk, renames it over the target and syncs the folder, so that after a power cut
// the name leads to the old content or to all of the new. Whatever fails on the way (a full disk, a failing device, the caller's own function) the
// target is as it was and the temporary file is gone. A process that is killed leaves its temporary file behind: RemoveLeftovers
// clears them, to be called by whoever holds the folder's lock. The target must be a regular file or absent. A symbolic link is
// replaced by the file, not followed.
//
// # Locking
//
// Acquire takes an advisory lock (flock on Unix systems, LockFileEx on Windows) on a file that stays in the folder and tells who
// holds it. The system drops the lock when the process ends, however it ends. On network file systems locks may be missing or
// reach only one machine: use them as a guard against mistakes, not to hand out work. Where there are none the error is
// errors.ErrUnsupported and the caller may go on without.
package atomicfile
