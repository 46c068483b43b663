package ingest

import (
	"bytes"
	"fmt"
	"io"
	"os"
)

// window is the stretch of a stream that a reader is looking at. It grows as
// far as its user asks for more, so the user sets the limit.
type window struct {
	in       io.Reader
	buf      []byte
	from, to int   // the unread bytes are buf[from:to]
	line     int   // 1-based line of the first unread byte
	err      error // why no more can be read; nil while more may come
}

// windowSize is the first size of the buffer, and how much Open looks at to
// tell the format: enough for the header of a very wide table.
const windowSize = 64 << 10

func newWindow(in io.Reader) *window {
	return &window{in: in, line: 1, buf: make([]byte, windowSize)}
}

// bytes are the unread bytes; they stay valid until more is called.
func (w *window) bytes() []byte { return w.buf[w.from:w.to] }

// ended tells whether the unread bytes are the last of the stream.
func (w *window) ended() bool { return w.err == io.EOF }

// fault is the error that broke the stream off, or nil.
func (w *window) fault() error {
	if w.err == io.EOF {
		return nil
	}
	return w.err
}

// more adds at least one unread byte and reports whether there was one. It
// may move the unread bytes.
func (w *window) more() bool {
	if w.err != nil {
		return false
	}
	if w.to == len(w.buf) {
		if w.from > 0 {
			w.to = copy(w.buf, w.buf[w.from:w.to])
			w.from = 0
		} else {
			w.buf = append(w.buf, make([]byte, len(w.buf))...)
		}
	}
	// A reader may return nothing without an error; as bufio does, give up
	// after a hundred of those.
	for range 100 {
		n, err := w.in.Read(w.buf[w.to:])
		w.to += n
		w.err = err
		if n > 0 {
			return true
		}
		if err != nil {
			return false
		}
	}
	w.err = io.ErrNoProgress
	return false
}

// double reads until twice as many bytes are unread, at most limit, so that
// looking again from the start costs no more than twice the length in all.
// It reports whether anything was added.
func (w *window) double(limit int) bool {
	want := min(2*(w.to-w.from), limit)
	added := false
	for first := true; first || w.to-w.from < want; first = false {
		if !w.more() {
			break
		}
		added = true
	}
	return added
}

// fill reads until n bytes are unread or the stream ends.
func (w *window) fill(n int) {
	for w.to-w.from < n && w.more() {
	}
}

// take consumes n bytes and returns them; they stay valid until more is
// called.
func (w *window) take(n int) []byte {
	b := w.buf[w.from : w.from+n]
	w.from += n
	w.line += bytes.Count(b, []byte{'\n'})
	return b
}

// spool moves bytes to a temporary file in dir until end says where the row
// ends: how many of the given bytes still belong to it, and whether it ends
// there. The end of the stream ends the row too.
func (w *window) spool(dir string, end func([]byte) (n int, done bool)) (path string, size int64, err error) {
	out, err := os.CreateTemp(dir, "row-*")
	if err != nil {
		return "", 0, fmt.Errorf("set a large row aside: %w", err)
	}
	for {
		n, done := end(w.bytes())
		size += int64(n)
		if _, err = out.Write(w.take(n)); err != nil || done || !w.more() {
			break
		}
	}
	if err == nil {
		err = w.fault()
	}
	if closing := out.Close(); err == nil {
		err = closing
	}
	if err != nil {
		os.Remove(out.Name())
		return "", 0, fmt.Errorf("set a large row aside: %w", err)
	}
	return out.Name(), size, nil
}

// lineEnd is an end for spool that stops before the next line break.
func lineEnd(b []byte) (int, bool) {
	if i := bytes.IndexByte(b, '\n'); i >= 0 {
		return i, true
	}
	return len(b), false
}

// withoutBreak cuts one trailing "\n" or "\r\n".
func withoutBreak(b []byte) []byte {
	return bytes.TrimSuffix(bytes.TrimSuffix(b, []byte{'\n'}), []byte{'\r'})
}
