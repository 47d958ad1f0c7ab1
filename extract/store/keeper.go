package store

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"io"
	"os"
	"path/filepath"
)

// Keeper keeps checkpoints of a run, opaque bytes by key, in DIR/.partial. They
// are bound to a case: what was saved for another one is not there. Its methods
// may be called from several goroutines.
//
// A file is the bytes followed by a SHA-256 over case, key and bytes.
type Keeper struct {
	disk disk
	dir  string // the result directory
	bind [sha256.Size]byte
}

// NewKeeper gives the keeper of the result directory dir for the case whose
// case.yaml is caseYAML. It touches no file.
func NewKeeper(dir string, caseYAML []byte) *Keeper {
	return &Keeper{disk: system{}, dir: dir, bind: sha256.Sum256(caseYAML)}
}

func (k *Keeper) path(key string) string {
	name := sha256.Sum256([]byte(key))
	return filepath.Join(k.dir, partialDir, hex.EncodeToString(name[:16])+".checkpoint")
}

// trailer sums the case, the key and the data, each of known length.
func (k *Keeper) trailer(key string, data []byte) []byte {
	h := sha256.New()
	h.Write(k.bind[:])
	name := sha256.Sum256([]byte(key))
	h.Write(name[:])
	h.Write(data)
	return h.Sum(nil)
}

// Load gives what was last saved under key. Nothing, a file that cannot be read,
// a truncated or altered one and one of another case are all "not there".
func (k *Keeper) Load(key string) ([]byte, bool) {
	all, err := os.ReadFile(k.path(key))
	if err != nil || len(all) < sha256.Size {
		return nil, false
	}
	cut := len(all) - sha256.Size
	data := all[:cut:cut]
	if string(k.trailer(key, data)) != string(all[cut:]) {
		return nil, false
	}
	return data, true
}

// Save keeps data under key, in place of what was there, and is done when they
// outlast a power failure. An error is *FileSystem; what Load then gives is the
// earlier data, or the new where only the last sync failed.
func (k *Keeper) Save(key string, data []byte) error {
	if err := k.save(key, data); err != nil {
		return &FileSystem{Doing: "save a checkpoint in", Path: k.dir, Err: err}
	}
	return nil
}

func (k *Keeper) save(key string, data []byte) error {
	partial := filepath.Join(k.dir, partialDir)
	if err := mkdirDurable(k.disk, partial); err != nil {
		return err
	}
	holder, err := k.disk.MkdirTemp(partial, "saving-")
	if err != nil {
		return err
	}
	temporary := filepath.Join(holder, "data")
	err = writeFile(k.disk, temporary, func(w io.Writer) error {
		if _, err := w.Write(data); err != nil {
			return err
		}
		_, err := w.Write(k.trailer(key, data))
		return err
	})
	if err == nil {
		err = k.disk.Rename(temporary, k.path(key))
	}
	if err == nil {
		err = k.disk.SyncDir(partial)
	}
	return errors.Join(err, k.disk.RemoveAll(holder))
}

// Clear removes all checkpoints, and the result directory when nothing else is
// in it. An error is *FileSystem.
func (k *Keeper) Clear() error {
	if err := k.disk.RemoveAll(filepath.Join(k.dir, partialDir)); err != nil {
		return &FileSystem{Doing: "remove the checkpoints in", Path: k.dir, Err: err}
	}
	if entries, err := os.ReadDir(k.dir); err != nil || len(entries) > 0 {
		return nil
	}
	if err := k.disk.Remove(k.dir); err != nil {
		return &FileSystem{Doing: "remove the empty directory", Path: k.dir, Err: err}
	}
	return nil
}
