package measure

import (
	"errors"
	"io/fs"
	"os"
)

// SaveError tells why a case could not be saved, what stands on disk now and what to do.
type SaveError struct {
	Path   string
	Failed string // what could not be done
	Stands string // what is on disk now
	Reason string // why, in plain words, and the system's own behind it
	Todo   string // what to do next
	Err    error  // as the system gave it
}

// Error gives all of it in one line.
func (e *SaveError) Error() string {
	return e.Path + ": not saved, " + e.Failed + ": " + e.Reason + "; " + e.Stands + "; " + e.Todo
}

// Unwrap gives the system's error.
func (e *SaveError) Unwrap() error { return e.Err }

// stage is a part of saving, named by what is said when it fails.
type stage string

const (
	finding    stage = "its place cannot be found"
	looking    stage = "it cannot be written over"
	locking    stage = "it cannot be locked for writing"
	writing    stage = "the new file cannot be written beside it"
	replacing  stage = "the new file cannot be put in its place"
	unsettled  stage = "putting the new file in its place failed half-way"
	confirming stage = "the system cannot confirm that the new file is on the disk"
)

// stands says what is on disk after a stage failed.
func (s stage) stands(isNew bool) string {
	switch {
	case s == confirming:
		return "the new file stands in its place but might not outlast a power cut"
	case s == unsettled:
		return "the old file or the new one stands there, whole"
	case isNew:
		return "no case was written"
	}
	return "the old file is untouched"
}

// Reasons of our own.
var (
	errNotPlain  = errors.New("what stands there is a folder, a link or a device, not a file")
	errReadOnly  = errors.New("the file is read-only")
	errElsewhere = errors.New("the link or folder leads to another place than a moment ago")
)

// remedy is one reason in plain words, and what to do about it.
type remedy struct{ words, todo string }

// The reasons a technician can do something about.
var (
	diskFull       = remedy{"the disk is full", "make room on it, then try again"}
	writeProtected = remedy{"the disk is write-protected", "take the protection off, or copy the case to another disk, then try again"}
	notAllowed     = remedy{"this user may not write there", "make the folder writable, or copy the case to one that is, then try again"}
	folderGone     = remedy{"the folder is gone", "put the folder or the drive back, then try again"}
	diskFault      = remedy{"the disk reports a fault", "copy the case to another disk and go on there; trust this one no longer"}
	notAnswering   = remedy{"the network drive does not answer", "connect it again, then try again"}
	pathTooLong    = remedy{"the path is too long", "move the case to a folder with a shorter path, then try again"}
	heldByOther    = remedy{"another program holds the file open", "close it there, then try again"}
	otherWriter    = remedy{"another program is writing this case at this moment", "wait until it is done, then try again"}
	readOnly       = remedy{"the file is read-only", "somebody protected it: make it writable if it is to be changed, or work on a copy, then try again"}
	notPlain       = remedy{"what stands there is no file", "move it away and put the case back, then try again"}
	deadLink       = remedy{"it is a link that leads nowhere or in a circle", "point the link at the case, or take it away, then try again"}
	movedLink      = remedy{"the path leads to another place than a moment ago", "see which file it should be, then try again"}
	lockTaken      = remedy{"what stands at the name of its lock file is no file", "take away the hidden .NAME.lock beside the case, then try again"}
	unknownReason  = remedy{"", "try again; if it stays so, copy the case to another disk and go on there"}
)

// trouble is a reason with the errors that mean it.
type trouble struct {
	remedy remedy
	errs   []error
}

// ownTroubles come before the system's: an error may be marked with one of ours.
var ownTroubles = []trouble{
	{otherWriter, []error{ErrLocked}},
	{heldByOther, []error{ErrBusy}},
	{deadLink, []error{errLink}},
	{readOnly, []error{errReadOnly}},
	{notPlain, []error{errNotPlain}},
	{movedLink, []error{errElsewhere}},
	{lockTaken, []error{errSide}},
}

// portableTroubles come last: the system's own errors count among them.
var portableTroubles = []trouble{
	{notAllowed, []error{fs.ErrPermission}},
	{folderGone, []error{fs.ErrNotExist}},
	{notAnswering, []error{os.ErrDeadlineExceeded}},
}

// remedyOf finds the reason an error stands for.
func remedyOf(err error) remedy {
	for _, list := range [][]trouble{ownTroubles, systemTroubles, portableTroubles} {
		for _, t := range list {
			for _, e := range t.errs {
				if errors.Is(err, e) {
					return t.remedy
				}
			}
		}
	}
	return unknownReason
}

// failed makes the error of a stage.
func (f *File) failed(s stage, err error) error {
	r := remedyOf(err)
	reason, system := r.words, systemWords(err)
	switch {
	case reason == "":
		reason = system
	case system != "" && system != reason:
		reason += " (" + system + ")"
	}
	return &SaveError{Path: f.Path, Failed: string(s), Stands: s.stands(f.read == nil), Reason: reason, Todo: r.todo, Err: err}
}

// systemWords gives the system's own words for an error, without paths; "" where it has none.
func systemWords(err error) string {
	var p *fs.PathError
	var l *os.LinkError
	switch {
	case errors.As(err, &p):
		return p.Err.Error()
	case errors.As(err, &l):
		return l.Err.Error()
	}
	for _, own := range ownTroubles {
		if errors.Is(err, own.errs[0]) {
			return ""
		}
	}
	return err.Error()
}
