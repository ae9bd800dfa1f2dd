"""File systems of their own, on a file or in memory, that can be filled up and cut off."""

import fcntl
import os
import shutil
import struct
import subprocess

import rig

# FS_IOC_SHUTDOWN, and its way of stopping at once without writing the file system's journal out.
_SHUTDOWN, _NO_LOG_FLUSH = 0x8004587D, 2


class Mounted:
    """An ext4 (with a block size and a data mode) or a tmpfs, mounted while in the `with` block."""

    def __init__(self, base, kind, mib=24):
        self.kind, self.image, self.point = kind, os.path.join(base, "image"), os.path.join(base, "m")
        self.mib, self.there = mib, False
        os.makedirs(self.point, exist_ok=True)

    def __enter__(self):
        if self.kind != "tmpfs":
            with open(self.image, "wb") as f:
                f.truncate(self.mib << 20)
            _, _, block = self.kind.split("-")
            _run("mkfs.ext4", "-q", "-F", "-m", "0", "-b", block, self.image)
        self.mount()
        return self

    def __exit__(self, *_):
        self.unmount()
        if os.path.exists(self.image):
            os.unlink(self.image)

    def mount(self):
        if self.kind == "tmpfs":
            _run("mount", "-t", "tmpfs", "-o", f"size={self.mib}m", "tmpfs", self.point)
        else:
            _, data, _ = self.kind.split("-")
            _run("mount", "-o", f"loop,data={data}", self.image, self.point)
        self.there = True

    def unmount(self):
        if self.there:
            _run("umount", self.point)
            self.there = False

    def cut(self):
        """As if the power went: what the disk does not have by now it will never get."""
        fd = os.open(self.point, os.O_RDONLY)
        try:
            fcntl.ioctl(fd, _SHUTDOWN, struct.pack("I", _NO_LOG_FLUSH))
        finally:
            os.close(fd)

    def again(self):
        self.unmount()
        self.mount()

    def fill(self):
        """Not a block is left."""
        with open(self._filler(), "ab", buffering=0) as f:
            for size in (1 << 20, 4096, 512):
                try:
                    while True:
                        f.write(b"\xa5" * size)
                except OSError:
                    pass
            # What was promised but not placed yet may need more room than there is.
            try:
                os.fsync(f.fileno())
            except OSError:
                pass

    def empty(self):
        os.unlink(self._filler())

    def _filler(self):
        return os.path.join(self.point, "filler")


def missing(base, cuts):
    """Why no such file system can be had here, or None."""
    if os.geteuid() != 0:
        return "only root may mount"
    for command in ("mount", "umount", "mkfs.ext4"):
        if shutil.which(command) is None:
            return f"there is no {command}"
    base = os.path.join(base, "probe")
    try:
        with Mounted(base, "ext4-ordered-4096", mib=16) as m:
            if cuts:
                m.cut()
    except (rig.NotRun, OSError) as e:
        return str(e)
    return None


def _run(*command):
    run = subprocess.run(command, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True)
    if run.returncode != 0:
        raise rig.NotRun(f"{' '.join(command[:2])} failed: {run.stdout.strip()}")
