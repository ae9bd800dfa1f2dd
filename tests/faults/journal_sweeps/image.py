"""What may be on the disk after a power cut: a model of files, folders and what has been synced.

It promises less than any real file system: of what was not synced any part may be there, whole calls
or 512-byte sectors of them, in any order; a name lasts only when its folder was synced, whatever was
done to the file. What a failed sync covered may be gone for good although a later sync succeeds,
since the kernel takes those pages for clean (Rebello et al., 2020), until something else in the same
page is written and synced.
"""

import hashlib
import os

PAGE, SECTOR = 4096, 512
FOLDER = "a folder"


class Piece:
    """Part of one call within one page; `size` instead of bytes for a change of length."""

    __slots__ = ("call", "at", "data", "size", "clean")

    def __init__(self, call, at, data, size=None):
        self.call, self.at, self.data, self.size, self.clean = call, at, data, size, False


def pieces(call, at, data):
    while data:
        room = PAGE - at % PAGE
        yield Piece(call, at, data[:room])
        at, data = at + room, data[room:]


def apply(content, ops):
    content = bytearray(content)
    for op in ops:
        if op.size is not None:
            del content[op.size :]
            content.extend(bytes(op.size - len(content)))
            continue
        end = op.at + len(op.data)
        if end > len(content):
            content.extend(bytes(end - len(content)))
        content[op.at : end] = op.data
    return bytes(content)


class File:
    def __init__(self, content=b""):
        self.durable, self.pending = content, []

    def sync(self):
        pages = {p.at // PAGE for p in self.pending if p.size is None and not p.clean}
        stay, done = [], []
        for p in self.pending:
            kept = p.size is not None or not p.clean or p.at // PAGE in pages
            (done if kept else stay).append(p)
        self.durable, self.pending = apply(self.durable, done), stay

    def failed_sync(self):
        for p in self.pending:
            p.clean = True


class Disk:
    """Names and files as they are, and as they are certain to be."""

    def __init__(self, root, skip):
        self.root, self.files, self.names, self.renames = root, {}, {}, []
        self.calls = 0
        for folder, inner, files in os.walk(root):
            self.names.update((os.path.join(folder, f), FOLDER) for f in inner)
            for path in (os.path.join(folder, f) for f in files):
                if path.endswith(skip):
                    continue
                with open(path, "rb") as f:
                    self.files[path] = File(f.read())
                self.names[path] = path
        # A file is known by the path it had first; which number it has on the disk, by this.
        self.known = {_number(path): path for path in self.files}

    def create(self, path, number):
        # A number can come again once its file is gone, and so can a name.
        self.calls += 1
        file = f"{path}#{self.calls}"
        self.known[number] = file
        self.files[file] = File()
        self.renames.append(("create", self.calls, path, None, file))

    def mkdir(self, path):
        self.calls += 1
        self.renames.append(("create", self.calls, path, None, FOLDER))

    def unlink(self, path):
        self.calls += 1
        self.renames.append(("unlink", self.calls, path, None, self.now()[path]))

    def rename(self, old, new):
        self.calls += 1
        self.renames.append(("rename", self.calls, old, new, self.now()[old]))

    def write(self, number, at, data):
        self.calls += 1
        self.files[self.known[number]].pending.extend(pieces(self.calls, at, data))

    def resize(self, number, size):
        self.calls += 1
        self.files[self.known[number]].pending.append(Piece(self.calls, 0, b"", size))

    def sync(self, number, succeeded):
        file = self.files[self.known[number]]
        file.sync() if succeeded else file.failed_sync()

    def sync_folder(self, path, succeeded):
        """Names that came to this folder or went from it last."""
        if not succeeded:
            return
        mine = lambda r: os.path.dirname(r[3] or r[2]) == path
        self.names = _named(self.names, [r for r in self.renames if mine(r)])
        self.renames = [r for r in self.renames if not mine(r)]

    def now(self):
        return _named(self.names, self.renames)

    def open_calls(self):
        """Calls of which nobody knows whether they will last."""
        calls = {r[1] for r in self.renames}
        for file in self.files.values():
            calls.update(p.call for p in file.pending)
        return sorted(calls)

    def state(self, lasting, torn):
        """Path to content, if these calls last, and of those in `torn` only some sectors: a function
        from the sector's number within the call's piece to whether it lasts."""
        names = _named(self.names, [r for r in self.renames if r[1] in lasting])
        state = {}
        for path, file in names.items():
            if file == FOLDER or not self.reached(path, names):
                continue
            f = self.files[file]
            ops = []
            for p in f.pending:
                if p.call not in lasting:
                    continue
                if p.call in torn and p.size is None:
                    ops.extend(_sectors(p, torn[p.call]))
                else:
                    ops.append(p)
            state[path] = apply(f.durable, ops) if ops else f.durable
        return state


    def reached(self, path, names):
        """A file is there only if each folder above it is."""
        folder = os.path.dirname(path)
        return folder == self.root or folder in names and self.reached(folder, names)


def _sectors(piece, lasts):
    at, data = piece.at, piece.data
    while data:
        room = SECTOR - at % SECTOR
        if lasts(at // SECTOR):
            yield Piece(piece.call, at, data[:room])
        at, data = at + room, data[room:]


def _number(path):
    stat = os.stat(path)
    return stat.st_dev, stat.st_ino


def _named(names, renames):
    names = dict(names)
    for what, _, path, new, file in renames:
        if what == "create":
            names[path] = file
        elif names.get(path) == file:
            del names[path]
        if what == "rename":
            names[new] = file
    return names


def digest(state, root):
    """The same wherever the folder lies."""
    h = hashlib.blake2b(digest_size=12)
    for path in sorted(state):
        h.update(f"{path[len(root) :]}\0{len(state[path])}\0".encode())
        h.update(state[path])
    return h.digest()
