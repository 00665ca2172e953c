// Package runfolder keeps what a run leaves on disk: its layout, its result
// document and the schema of it, its log, and the rules by which a folder is
// resumed, returned as it is, refused or moved aside.
//
// A run folder holds
//
//	model.toml     the model file as read
//	result.json    the results, format "rundle-result/1", written last
//	log.jsonl      one line a sweep
//	status.json    what goes on now, for a look from elsewhere
//	state-K.npz    the states, K counting from 0
//	checkpoint/    what is needed to go on
//	scratch/       while a run lasts: what a cap on memory sends to disk
//
// Every file but the log is written to a new file, synced and renamed, so that
// a reader never sees half of one. Log lines are appended whole; a line cut
// off by a kill is dropped when the folder is opened again, and [Folder.KeepLog]
// drops those of sweeps that are to be done again. A folder is locked
// while a run writes to it; reading takes no lock.
//
// [Open] decides by the hash of the model, which covers all that determines
// the results. The same hash: a finished run is returned as it is, an
// unfinished one goes on. Another hash: a [*Conflict] that names the first
// differences; nothing is touched. A folder that is no run folder is refused.
// With Fresh the old folder is moved aside, never deleted.
//
// Numbers that are not finite are never written: [Folder.WriteResult] returns
// an error that names the field, and the folder stays as it was.
package runfolder
