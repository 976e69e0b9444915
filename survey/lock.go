package survey

import (
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"time"

	"lacuna/internal/oops"
)

// LockName is the file that says who works in a results folder.
const LockName = "journal.lock"

// lock takes the folder for this process. Its text (host, process, start) is for
// people and for file systems that do not share locks between hosts.
func lock(dir string, now time.Time) (*os.File, error) {
	path := filepath.Join(dir, LockName)
	f, err := os.OpenFile(path, os.O_RDWR|os.O_CREATE, 0o644)
	if err != nil {
		return nil, err
	}
	held, err := flock(f)
	text, rerr := io.ReadAll(io.LimitReader(f, 1000))
	who := strings.Join(strings.Fields(string(text)), " ")
	if err != nil || rerr != nil {
		f.Close()
		return nil, fmt.Errorf("locking %s: %w", path, firstOf(err, rerr))
	}
	host, _ := os.Hostname()
	if !held {
		f.Close()
		if who == "" {
			who = "it has not said which"
		}
		return nil, oops.Input(dir, "", "another run works here ("+who+")", "wait for it, or choose another folder with --out")
	}
	if who != "" && !strings.HasPrefix(who, "host "+host+" ") {
		f.Close()
		return nil, oops.Input(dir, "", "a run on another computer works here, or ended without a word ("+who+")",
			"if it no longer runs, delete "+LockName+" in this folder")
	}
	if err := writeLock(f, fmt.Sprintf("host %s process %d since %s\n", host, os.Getpid(), now.UTC().Format(time.RFC3339))); err != nil {
		f.Close()
		return nil, fmt.Errorf("locking %s: %w", path, err)
	}
	return f, nil
}

// unlock empties the lock file and lets go of it. The file stays: removing it
// would let two runs lock two files of the same name.
func unlock(f *os.File) error {
	err := f.Truncate(0)
	return firstOf(err, f.Close())
}

func writeLock(f *os.File, text string) error {
	if err := f.Truncate(0); err != nil {
		return err
	}
	_, err := f.WriteAt([]byte(text), 0)
	return err
}

func firstOf(errs ...error) error {
	for _, err := range errs {
		if err != nil {
			return err
		}
	}
	return nil
}
