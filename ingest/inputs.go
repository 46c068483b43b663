package ingest

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"sort"
	"strings"

	"github.com/klauspost/compress/zip"
)

// zipMagic begins a ZIP archive.
const zipMagic = "PK\x03\x04"

// Bounds of what archives and folders may hold.
const (
	maxInputs = 100_000
	// An archive that unpacks to more than maxRatio times its size is not an
	// export of reports: text packs to a tenth or so. Small files may.
	maxRatio  = 250
	freeBytes = 64 << 20
)

// ErrNoReports is in the errors of files that hold no table of reports at
// all: pictures, programs, empty files.
var ErrNoReports = errors.New("no reports")

// noReports marks an error as ErrNoReports without changing its words.
type noReports struct{ error }

func (noReports) Is(target error) bool { return target == ErrNoReports }
func (e noReports) Unwrap() error      { return e.error }

// Input is one file to read: named by the user, or found in a folder or in an
// archive that was named.
type Input struct {
	// Path is the file, "-" for standard input, or, for a member of an
	// archive, the archive and the member, as in "2019.zip/reports.csv".
	Path  string
	Found bool  // in a folder or an archive
	Size  int64 // bytes on disk, 0 where not known

	open func() (io.ReadCloser, error) // nil for a file on disk
}

// Reader opens the input's stream, nil for a file that Open opens itself.
func (in Input) Reader() (io.ReadCloser, error) {
	if in.open == nil {
		return nil, nil
	}
	return in.open()
}

// Inputs is what a path stands for: itself, the files of a folder in the
// order of their names, or the members of a ZIP archive. Hidden files are
// passed over. Close when all are read.
type Inputs struct {
	List    []Input
	closers []io.Closer
	spool   string
}

// Close closes the archive.
func (l *Inputs) Close() error {
	var err error
	for _, c := range l.closers {
		err = errors.Join(err, c.Close())
	}
	if l.spool != "" {
		err = errors.Join(err, os.Remove(l.spool))
	}
	return err
}

// FindInputs lists what is to be read for a path; stdin is read for "-", and
// spooled into dir if it is an archive, whose directory stands at its end.
func FindInputs(ctx context.Context, path string, stdin io.Reader, dir string) (*Inputs, error) {
	l := &Inputs{}
	var err error
	if path == "-" {
		err = l.addStream(stdin, dir)
	} else {
		err = l.addPath(ctx, path)
	}
	if err != nil {
		l.Close()
		name := fmt.Sprintf("%q", path)
		if path == "-" {
			name = "standard input"
		}
		return nil, fmt.Errorf("open %s: %w", name, err)
	}
	return l, nil
}

func (l *Inputs) addStream(stdin io.Reader, dir string) error {
	if stdin == nil {
		return fmt.Errorf("nothing to read from")
	}
	in := bufio.NewReaderSize(stdin, windowSize)
	head, _ := in.Peek(windowSize)
	if !strings.HasPrefix(string(head), zipMagic) || looksXLSX(head) {
		l.List = append(l.List, Input{Path: "-", open: func() (io.ReadCloser, error) { return io.NopCloser(in), nil }})
		return nil
	}
	out, err := spoolStream(in, dir)
	if err != nil {
		return err
	}
	l.spool = out
	return l.addArchive(out, "-")
}

// spoolStream copies a stream to a temporary file.
func spoolStream(in io.Reader, dir string) (string, error) {
	out, err := os.CreateTemp(dir, "stream-*")
	if err != nil {
		return "", fmt.Errorf("keep the stream: %w", err)
	}
	_, err = io.Copy(out, in)
	if closing := out.Close(); err == nil {
		err = closing
	}
	if err != nil {
		os.Remove(out.Name())
		return "", fmt.Errorf("keep the stream: %w", err)
	}
	return out.Name(), nil
}

func (l *Inputs) addPath(ctx context.Context, path string) error {
	info, err := os.Stat(path)
	if err != nil {
		return plain(err)
	}
	if !info.IsDir() {
		return l.addFile(path, false, info.Size())
	}
	return filepath.WalkDir(path, func(p string, d fs.DirEntry, err error) error {
		if err == nil {
			err = ctx.Err()
		}
		if err != nil {
			return err
		}
		if p != path && strings.HasPrefix(d.Name(), ".") {
			if d.IsDir() {
				return fs.SkipDir
			}
			return nil
		}
		if d.IsDir() {
			return nil
		}
		info, err := os.Stat(p) // of what a link points to
		if err != nil || !info.Mode().IsRegular() {
			return nil
		}
		return l.addFile(p, true, info.Size())
	})
}

// addFile adds a file, or the members of an archive.
func (l *Inputs) addFile(path string, found bool, size int64) error {
	if isArchive(path) {
		return l.addArchive(path, path)
	}
	return l.add(Input{Path: path, Found: found, Size: size})
}

func (l *Inputs) add(in Input) error {
	if len(l.List) == maxInputs {
		return fmt.Errorf("more than %d files", maxInputs)
	}
	l.List = append(l.List, in)
	return nil
}

// isArchive tells whether a file is a ZIP archive but no workbook. What
// cannot be read is told when it is opened.
func isArchive(path string) bool {
	f, err := os.Open(path)
	if err != nil {
		return false
	}
	defer f.Close()
	head := make([]byte, windowSize)
	n, _ := io.ReadFull(f, head)
	return strings.HasPrefix(string(head[:n]), zipMagic) && !looksXLSX(head[:n])
}

// addArchive adds the members of the archive in the file, called name.
func (l *Inputs) addArchive(file, name string) error {
	z, err := zip.OpenReader(file)
	if err != nil {
		return fmt.Errorf("a broken ZIP archive: %w", err)
	}
	l.closers = append(l.closers, z)
	members := z.File
	sort.SliceStable(members, func(i, j int) bool { return members[i].Name < members[j].Name })
	for _, m := range members {
		if m.FileInfo().IsDir() || hidden(m.Name) {
			continue
		}
		err := l.add(Input{Path: name + "/" + m.Name, Found: true, open: func() (io.ReadCloser, error) {
			in, err := m.Open()
			if err != nil {
				return nil, fmt.Errorf("a broken ZIP archive: %w", err)
			}
			packed := int64(m.CompressedSize64)
			return &boundedReader{in: in, packed: func() int64 { return packed }}, nil
		}})
		if err != nil {
			return err
		}
	}
	return nil
}

// hidden tells whether any part of a member's name begins with a point or is
// a folder that a system puts beside the files.
func hidden(name string) bool {
	for _, part := range strings.FieldsFunc(name, func(r rune) bool { return r == '/' || r == '\\' }) {
		if strings.HasPrefix(part, ".") || part == "__MACOSX" {
			return true
		}
	}
	return false
}

// boundedReader refuses a stream that unpacks to far more than it was.
type boundedReader struct {
	in     io.ReadCloser
	packed func() int64 // bytes read so far, packed
	n      int64
}

func (b *boundedReader) Read(p []byte) (int, error) {
	n, err := b.in.Read(p)
	b.n += int64(n)
	if b.n > freeBytes && b.n > maxRatio*max(1, b.packed()) {
		return 0, fmt.Errorf("unpacks to more than %d times its size, as no export of reports does: unpack it and look at what is inside", maxRatio)
	}
	return n, err
}

func (b *boundedReader) Close() error { return b.in.Close() }
