package collection

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"time"

	"github.com/gofrs/flock"
)

// ErrHeld is a collection that another process writes to.
var ErrHeld = errors.New("another process is writing to the collection")

// holder is who holds the lock, as told to those who wait.
type holder struct {
	Command string    `json:"command"`
	PID     int       `json:"pid"`
	Since   time.Time `json:"since"`
}

func (h holder) String() string {
	if h.Command == "" {
		return "another process"
	}
	return fmt.Sprintf("catena %s (process %d, since %s)", h.Command, h.PID, h.Since.Format("15:04:05"))
}

// lock takes the writer's lock of a folder. Where another process holds it,
// waiting is told once for whom, and tried again until patience is over. The
// lock goes with the process, however that ends; the note of who holds it
// stands in a file of its own, since Windows lets nobody read a locked one.
func lock(ctx context.Context, dir, command string, patience time.Duration, now func() time.Time, waiting func(string)) (unlock func(), err error) {
	l := flock.New(filepath.Join(dir, "writer.lock"))
	note := filepath.Join(dir, "writer.json")
	got, err := l.TryLock()
	if err != nil {
		return nil, fmt.Errorf("lock the collection: %w", err)
	}
	if !got {
		who := readHolder(note)
		if patience <= 0 {
			return nil, fmt.Errorf("%w: %s", ErrHeld, who)
		}
		waiting(fmt.Sprintf("waiting up to %s: %s is writing to this collection", patience, who))
		waitCtx, cancel := context.WithTimeout(ctx, patience)
		defer cancel()
		got, err = l.TryLockContext(waitCtx, 100*time.Millisecond)
		switch {
		case ctx.Err() != nil:
			return nil, ctx.Err()
		case !got:
			return nil, fmt.Errorf("%w: %s", ErrHeld, readHolder(note))
		case err != nil:
			return nil, fmt.Errorf("lock the collection: %w", err)
		}
	}
	data, err := json.Marshal(holder{command, os.Getpid(), now()})
	if err == nil {
		err = os.WriteFile(note, data, 0o644)
	}
	if err != nil {
		l.Unlock()
		return nil, fmt.Errorf("lock the collection: %w", err)
	}
	return func() {
		os.Remove(note)
		l.Unlock()
	}, nil
}

// readHolder reads the note; a note that is missing or half-written tells nothing.
func readHolder(path string) holder {
	var h holder
	if data, err := os.ReadFile(path); err == nil {
		if json.Unmarshal(data, &h) != nil {
			return holder{}
		}
	}
	return h
}
