"""Stops a program at each of its calls that touch one folder, counts them over all its threads, and
kills it there, fails the call, cuts it short, or writes down what it did.

strace cannot serve for this: its `when=N` counts each thread by itself, so that the thread which
opens the journal hides the first calls of the thread that writes to it; and its `retval=` tells of a
short write that did not happen at all.
"""

import ctypes
import errno
import os
import platform
import signal
import struct
import time

_libc = ctypes.CDLL(None, use_errno=True)
_libc.ptrace.restype = ctypes.c_long
_libc.ptrace.argtypes = [ctypes.c_long, ctypes.c_long, ctypes.c_void_p, ctypes.c_void_p]

_TRACEME, _CONT, _GETREGS, _SETREGS, _SYSCALL, _SETOPTIONS = 0, 7, 12, 13, 24, 0x4200
_EVENT_CLONE, _EVENT_EXEC, _EVENT_SECCOMP = 3, 4, 7
# Clone and vfork and fork, exec, seccomp, exit with the tracer, and syscall stops marked.
_OPTIONS = 0x1 | 0x2 | 0x4 | 0x8 | 0x10 | 0x80 | 0x100000
_WALL = 0x40000000
_PR_SET_SECCOMP, _PR_SET_NO_NEW_PRIVS = 22, 38
_RET_ALLOW, _RET_TRACE = 0x7FFF0000, 0x7FF00000

# x86-64: number, name, where its file is: a descriptor or a path, and in which argument.
_CALLS = {
    0: ("read", "fd", 0), 17: ("pread64", "fd", 0),
    1: ("write", "fd", 0), 18: ("pwrite64", "fd", 0), 20: ("writev", "fd", 0),
    296: ("pwritev", "fd", 0), 328: ("pwritev2", "fd", 0),
    74: ("fsync", "fd", 0), 75: ("fdatasync", "fd", 0), 277: ("sync_file_range", "fd", 0),
    306: ("syncfs", "fd", 0), 26: ("msync", "none", 0),
    2: ("open", "path", 0), 257: ("openat", "at", 0), 85: ("creat", "path", 0),
    437: ("openat2", "at", 0),
    82: ("rename", "path", 0), 264: ("renameat", "at", 0), 316: ("renameat2", "at", 0),
    86: ("link", "path", 0), 265: ("linkat", "at", 0), 88: ("symlink", "path", 1),
    87: ("unlink", "path", 0), 263: ("unlinkat", "at", 0), 84: ("rmdir", "path", 0),
    83: ("mkdir", "path", 0), 258: ("mkdirat", "at", 0),
    76: ("truncate", "path", 0), 77: ("ftruncate", "fd", 0), 285: ("fallocate", "fd", 0),
    326: ("copy_file_range", "fd", 2), 40: ("sendfile", "fd", 0),
}
READS = {"read", "pread64"}
WRITES = {"write", "pwrite64", "writev", "pwritev", "pwritev2", "copy_file_range", "sendfile"}
SYNCS = {"fsync", "fdatasync", "sync_file_range", "syncfs", "msync"}
OPENS = {"open", "openat", "openat2", "creat"}

_RAX, _RDX, _RSI, _RDI, _R10, _R8, _ORIG = 10, 12, 13, 14, 7, 9, 15
_Regs = ctypes.c_ulonglong * 27


def missing():
    """Why this machine cannot trace, or None."""
    if platform.machine() != "x86_64":
        return f"the tracer knows x86_64 only, this is {platform.machine()}"
    seen = []
    try:
        run = trace(["/bin/true"], "/", "/dev/null", lambda call: seen.append(call.name), seconds=10)
    except OSError as e:
        return f"ptrace is not allowed here: {e}"
    return None if run.code == 0 and seen else "ptrace stops at no call here"


class Call:
    """One stop: the call has not been made yet."""

    __slots__ = ("no", "name", "path", "second", "args", "pid", "at", "memory")

    def __init__(self, no, name, path, second, args, pid, memory):
        self.no, self.name, self.path, self.second = no, name, path, second
        self.args, self.pid, self.memory = args, pid, memory
        self.at = time.monotonic()

    def size(self):
        """How much a write asks for, in bytes, or in parts for `writev`."""
        return self.args[{"copy_file_range": 4, "sendfile": 3}.get(self.name, 2)]

    def data(self):
        """The bytes of a write."""
        if self.name in ("write", "pwrite64"):
            return _read(self.memory, self.args[1], self.args[2])
        if self.name in ("writev", "pwritev", "pwritev2"):
            parts = _read(self.memory, self.args[1], 16 * self.args[2])
            pairs = struct.iter_unpack("QQ", parts)
            return b"".join(_read(self.memory, base, size) for base, size in pairs)
        raise ValueError(f"{self.name} carries no bytes")


class Ended:
    """How it went: exit code (negative: the signal), what was said when, calls counted."""

    def __init__(self):
        self.code, self.calls, self.said, self.hung = None, 0, [], False


KILL, SHORT = "kill", "short"
# What can be cut short, and the register that says how much is asked for.
_SIZE = {"write": _RDX, "pwrite64": _RDX, "writev": _RDX, "copy_file_range": _R8, "sendfile": _R10}


def can_be_short(call):
    return call.name in _SIZE and call.size() > 1


def trace(argv, root, out, decide, after=None, hear=None, reads=False, seconds=60.0):
    """Runs `argv` with its standard output in the file `out`. `decide(call)` is asked at each call on
    a path below `root`, and answers None (let it be), KILL, an errno to fail it with, or SHORT.
    `after(call, result)` is told the result of each, if given; `hear(text)` what it says on standard
    output, just before it is said.
    """
    ended = Ended()
    root = root.rstrip("/")
    numbers = [n for n, (name, _, _) in _CALLS.items() if reads or name not in READS]
    pid = _spawn(argv, out, numbers)
    state = _Tracees(pid, ended, hear)
    alarm = signal.signal(signal.SIGALRM, lambda *_: state.too_long())
    signal.setitimer(signal.ITIMER_REAL, seconds, 1.0)
    try:
        _loop(state, pid, root, decide, after)
    finally:
        signal.setitimer(signal.ITIMER_REAL, 0)
        signal.signal(signal.SIGALRM, alarm)
        state.close()
    return ended


def _loop(state, main, root, decide, after):
    while True:
        try:
            pid, status = os.waitpid(-1, _WALL)
        except ChildProcessError:
            return
        if os.WIFEXITED(status) or os.WIFSIGNALED(status):
            state.entered.pop(pid, None)
            if pid == main:
                state.ended.code = os.waitstatus_to_exitcode(status)
                return
            continue
        if not os.WIFSTOPPED(status):
            continue
        stop, event = os.WSTOPSIG(status), status >> 16
        if event == _EVENT_SECCOMP:
            state.call(pid, root, decide, after)
        elif event == _EVENT_EXEC:
            state.reopen(pid)
            state.go(_CONT, pid, 0)
        elif stop == signal.SIGTRAP | 0x80:
            state.result(pid, after)
        elif event or stop in (signal.SIGSTOP, signal.SIGTRAP):
            state.go(_CONT, pid, 0)
        else:
            state.go(_CONT, pid, stop)


class _Tracees:
    def __init__(self, main, ended, hear):
        self.main, self.ended, self.hear, self.entered = main, ended, hear, {}
        self.memory = None
        self.regs = _Regs()

    def reopen(self, pid):
        self.close()
        self.memory = os.open(f"/proc/{pid}/mem", os.O_RDONLY)

    def close(self):
        if self.memory is not None:
            os.close(self.memory)
            self.memory = None

    def too_long(self):
        self.ended.hung = True
        self.kill()

    def kill(self):
        try:
            os.kill(self.main, signal.SIGKILL)
        except ProcessLookupError:
            pass

    def go(self, how, pid, with_signal):
        # A thread that has been killed meanwhile is no longer there to be resumed.
        _libc.ptrace(how, pid, None, with_signal)

    def call(self, pid, root, decide, after):
        if _libc.ptrace(_GETREGS, pid, None, ctypes.addressof(self.regs)) != 0:
            return
        regs = self.regs
        args = (regs[_RDI], regs[_RSI], regs[_RDX], regs[_R10], regs[_R8])
        name, kind, at = _CALLS[regs[_ORIG]]
        if name == "write" and args[0] == 1:
            self.say(pid, args)
            return
        path, second = _paths(self.memory, pid, name, kind, at, args)
        if path is None or not (path == root or path.startswith(root + "/") or root == ""):
            self.go(_CONT, pid, 0)
            return
        self.ended.calls += 1
        call = Call(self.ended.calls, name, path, second, args, pid, self.memory)
        verdict = decide(call)
        if verdict == KILL:
            self.kill()
            return
        if verdict == SHORT:
            # The kernel really writes that many, and says so.
            size = _SIZE[name]
            regs[size] = max(1, regs[size] // 2)
            _libc.ptrace(_SETREGS, pid, None, ctypes.addressof(regs))
        elif verdict is not None:
            regs[_ORIG] = 2**64 - 1
            regs[_RAX] = 2**64 - verdict
            _libc.ptrace(_SETREGS, pid, None, ctypes.addressof(regs))
        if after is None:
            self.go(_CONT, pid, 0)
        else:
            self.entered[pid] = call
            self.go(_SYSCALL, pid, 0)

    def say(self, pid, args):
        text = _read(self.memory, args[1], args[2]).decode()
        self.ended.said.append((time.monotonic(), text))
        if self.hear is not None:
            self.hear(text)
        self.go(_CONT, pid, 0)

    def result(self, pid, after):
        call = self.entered.pop(pid, None)
        if call is not None and _libc.ptrace(_GETREGS, pid, None, ctypes.addressof(self.regs)) == 0:
            after(call, ctypes.c_longlong(self.regs[_RAX]).value)
        self.go(_CONT, pid, 0)


def _spawn(argv, out, numbers):
    program = _filter(numbers)
    pid = os.fork()
    if pid == 0:
        try:
            fd = os.open(out, os.O_WRONLY | os.O_CREAT | os.O_APPEND, 0o644)
            os.dup2(fd, 1)
            os.dup2(os.open("/dev/null", os.O_RDONLY), 0)
            if _libc.ptrace(_TRACEME, 0, None, None) != 0:
                os._exit(121)
            os.kill(os.getpid(), signal.SIGSTOP)
            _libc.prctl(_PR_SET_NO_NEW_PRIVS, 1, 0, 0, 0)
            if _libc.prctl(_PR_SET_SECCOMP, 2, ctypes.byref(program), 0, 0) != 0:
                os._exit(122)
            os.execv(argv[0], argv)
        finally:
            os._exit(123)
    _, status = os.waitpid(pid, _WALL)
    if not os.WIFSTOPPED(status):
        raise OSError(errno.EPERM, f"the child ended with {os.waitstatus_to_exitcode(status)}")
    if _libc.ptrace(_SETOPTIONS, pid, None, _OPTIONS) != 0:
        raise OSError(ctypes.get_errno(), "options of ptrace")
    _libc.ptrace(_CONT, pid, None, None)
    return pid


class _Program(ctypes.Structure):
    _fields_ = [("length", ctypes.c_ushort), ("filter", ctypes.c_char_p)]


def _filter(numbers):
    """Only these calls stop: all others run at full speed."""
    ins = [struct.pack("HBBI", 0x20, 0, 0, 0)]
    for i, n in enumerate(numbers):
        ins.append(struct.pack("HBBI", 0x15, len(numbers) - i, 0, n))
    ins.append(struct.pack("HBBI", 0x06, 0, 0, _RET_ALLOW))
    ins.append(struct.pack("HBBI", 0x06, 0, 0, _RET_TRACE))
    return _Program(len(ins), b"".join(ins))


def _read(memory, at, size):
    return os.pread(memory, size, at) if size else b""


def _text(memory, at):
    """A path: at most 4 KiB, and never over the end of its page at once."""
    parts = b""
    while len(parts) < 4096:
        room = 4096 - (at & 4095)
        part = os.pread(memory, room, at)
        end = part.find(b"\0")
        if end >= 0:
            return (parts + part[:end]).decode(errors="surrogateescape")
        parts, at = parts + part, at + room
    return parts.decode(errors="surrogateescape")


def _fd(pid, fd):
    try:
        return os.readlink(f"/proc/{pid}/fd/{fd}")
    except OSError:
        return None


def _whole(pid, base, path):
    if path.startswith("/"):
        return os.path.normpath(path)
    base = ctypes.c_int(base & 0xFFFFFFFF).value
    folder = os.readlink(f"/proc/{pid}/cwd") if base == -100 else _fd(pid, base)
    return None if folder is None else os.path.normpath(f"{folder}/{path}")


def _paths(memory, pid, name, kind, at, args):
    """The call's file and, for a rename or a link, its second."""
    if kind == "none":
        return None, None
    if kind == "fd":
        return _fd(pid, args[at] & 0xFFFFFFFF), None
    if kind == "path":
        second = None
        if name in ("rename", "link"):
            second = _whole(pid, -100, _text(memory, args[1]))
        return _whole(pid, -100, _text(memory, args[at])), second
    second = None
    if name in ("renameat", "renameat2", "linkat"):
        second = _whole(pid, args[2], _text(memory, args[3]))
    return _whole(pid, args[0], _text(memory, args[1])), second
