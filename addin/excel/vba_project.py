"""A VBA project without Excel: the project of a template, rebuilt from its sources alone.

[MS-OVBA] for the project, [MS-CFB] for the file it lies in. Compiled caches are dropped and the
version is set to 0xFFFF, so that the host compiles the sources when it opens the file.
"""

from __future__ import annotations

import io
import re
import struct
from collections.abc import Callable, Iterable, Mapping, Sequence

_CHUNK = 4096


def compress(data: bytes) -> bytes:
    """Data as a compressed container, [MS-OVBA] 2.4.1."""
    out = bytearray(b"\x01")
    for start in range(0, len(data), _CHUNK):
        chunk = data[start : start + _CHUNK]
        body = _compressed_chunk(chunk)
        if len(body) > _CHUNK:
            out += struct.pack("<H", 0x3FFF) + chunk.ljust(_CHUNK, b"\0")
        else:
            out += struct.pack("<H", (len(body) + 2 - 3) | 0xB000) + body
    return bytes(out)


def _compressed_chunk(chunk: bytes) -> bytes:
    body, at = bytearray(), 0
    while at < len(chunk):
        flags, tokens = 0, bytearray()
        for bit in range(8):
            if at >= len(chunk):
                break
            length, offset, bits = _longest_match(chunk, at)
            if length >= 3:
                tokens += struct.pack("<H", ((offset - 1) << (16 - bits)) | (length - 3))
                flags |= 1 << bit
                at += length
            else:
                tokens.append(chunk[at])
                at += 1
        body.append(flags)
        body += tokens
    return bytes(body)


def _longest_match(chunk: bytes, at: int) -> tuple[int, int, int]:
    """Length and distance of the longest earlier copy of what stands at `at`, and offset bits."""
    bits = max((at - 1).bit_length(), 4) if at > 1 else 4
    longest = (0xFFFF >> bits) + 3
    length = min(3, len(chunk) - at)
    if length < 3:
        return 0, 0, bits
    best, where = 0, 0
    found = chunk.rfind(chunk[at : at + length], 0, at + length - 1)
    while found >= 0 and found < at:
        size = 3
        while size < longest and at + size < len(chunk) and chunk[found + size] == chunk[at + size]:
            size += 1
        if size > best:
            best, where = size, found
            if size == longest:
                break
        found = chunk.rfind(chunk[at : at + 3], 0, found + 2)
    return best, at - where, bits


def decompress(data: bytes) -> bytes:
    """What a compressed container holds, [MS-OVBA] 2.4.1."""
    if data[:1] != b"\x01":
        raise ValueError("not a compressed container")
    out, at = bytearray(), 1
    while at < len(data):
        (head,) = struct.unpack_from("<H", data, at)
        end, at, start = at + (head & 0xFFF) + 3, at + 2, len(out)
        if not head & 0x8000:
            out += data[at : at + _CHUNK]
            at = end
            continue
        while at < end:
            flags, at = data[at], at + 1
            for bit in range(8):
                if at >= end:
                    break
                if not flags >> bit & 1:
                    out.append(data[at])
                    at += 1
                    continue
                (token,) = struct.unpack_from("<H", data, at)
                at += 2
                bits = max((len(out) - start - 1).bit_length(), 4)
                length, offset = (token & (0xFFFF >> bits)) + 3, (token >> (16 - bits)) + 1
                for _ in range(length):
                    out.append(out[-offset])
    return bytes(out)


def rebuilt(project: bytes, modules: Mapping[str, str], name: str) -> bytes:
    """The project under another name, with these modules in place of its own.

    What belongs to the workbook and its sheets stays, since the file refers to it.
    """
    import olefile  # in the extra "excel": only making the add-in file needs it

    ole = olefile.OleFileIO(io.BytesIO(project))

    def read(path: str) -> bytes:
        data: bytes = ole.openstream(path).read()
        return data

    text = read("PROJECT").decode("cp1252")
    documents = re.findall(r"(?m)^Document=(\w+)/", text)
    directory, sources = _directory(read, documents, modules, name)
    streams = {
        ("PROJECT",): _properties(text, modules, name).encode("cp1252"),
        ("PROJECTwm",): b"".join(map(_both_names, sources)) + b"\0\0",
        ("VBA", "_VBA_PROJECT"): b"\xcc\x61\xff\xff\x00\x01\x00",
        ("VBA", "dir"): compress(directory),
    }
    for module, source in sources.items():
        streams["VBA", module] = compress(source.encode("cp1252"))
    return compound_file(streams)


def source_of(project: bytes, module: str) -> str:
    """The source of one module."""
    import olefile

    ole = olefile.OleFileIO(io.BytesIO(project))
    directory = decompress(ole.openstream("VBA/dir").read())
    offsets, stream = {}, ""
    for kind, _, data in _records(directory):
        if kind == _STREAM_NAME:
            stream = data.decode("cp1252")
        elif kind == _SOURCE_OFFSET:
            (offsets[stream],) = struct.unpack("<I", data)
    packed = ole.openstream(f"VBA/{module}").read()[offsets[module] :]
    return decompress(packed).decode("cp1252")


def _properties(text: str, modules: Iterable[str], name: str) -> str:
    """The PROJECT stream; where editor windows stood is left out."""
    text = re.sub(r"(?m)^(Module|Class)=.*\r\n", "", text).partition("[Workspace]")[0]
    listed = "".join(f"Module={module}\r\n" for module in modules)
    return re.sub(r'(?m)^Name="[^"]*"', lambda _: f'{listed}Name="{name}"', text)


def _both_names(module: str) -> bytes:
    return module.encode("cp1252") + b"\0" + module.encode("utf-16le") + b"\0\0"


# records of the dir stream, [MS-OVBA] 2.3.4.2
_PROJECT_NAME, _VERSION, _MODULE_COUNT, _END = 0x04, 0x09, 0x0F, 0x10
_MODULE_NAME, _STREAM_NAME, _SOURCE_OFFSET, _MODULE_END = 0x19, 0x1A, 0x31, 0x2B


def _directory(
    read: Callable[[str], bytes], documents: Sequence[str], modules: Mapping[str, str], name: str
) -> tuple[bytes, dict[str, str]]:
    """The rewritten dir stream, and the source of every module in it."""
    out: list[bytes] = []
    sources: dict[str, str] = {}
    stream, dropped = "", False
    for kind, size, data in _records(decompress(read("VBA/dir"))):
        if kind == _PROJECT_NAME:
            data = name.encode("latin1")
        elif kind == _MODULE_COUNT:
            data = struct.pack("<H", len(documents) + len(modules))
        elif kind == _MODULE_NAME:
            dropped = data.decode("cp1252") not in documents
        elif kind == _STREAM_NAME:
            stream = data.decode("cp1252")
        elif kind == _SOURCE_OFFSET and not dropped:
            (offset,) = struct.unpack("<I", data)
            sources[stream] = decompress(read(f"VBA/{stream}")[offset:]).decode("cp1252")
            data = b"\0" * 4  # the source now begins the stream
        elif kind == _END:
            out += [_new_module(module) for module in modules]
        if not dropped:
            out.append(_record(kind, data, size if kind == _VERSION else None))
        dropped = dropped and kind != _MODULE_END
    return b"".join(out), {**sources, **modules}


def _records(data: bytes) -> list[tuple[int, int, bytes]]:
    out, at = [], 0
    while at < len(data):
        kind, size = struct.unpack_from("<HI", data, at)
        length = 6 if kind == _VERSION else size  # the version record misstates its own size
        out.append((kind, size, data[at + 6 : at + 6 + length]))
        at += 6 + length
    return out


def _record(kind: int, data: bytes = b"", size: int | None = None) -> bytes:
    return struct.pack("<HI", kind, len(data) if size is None else size) + data


def _new_module(name: str) -> bytes:
    narrow, wide = name.encode(), name.encode("utf-16le")
    return b"".join(
        [
            _record(0x19, narrow),
            _record(0x47, wide),
            _record(_STREAM_NAME, narrow),
            _record(0x32, wide),
            _record(0x1C),
            _record(0x48),
            _record(_SOURCE_OFFSET, b"\0" * 4),
            _record(0x1E, b"\0" * 4),
            _record(0x2C, b"\xff\xff"),
            _record(0x21),
            _record(0x2B),
        ]
    )


_FREE, _LAST, _TABLE = 0xFFFFFFFF, 0xFFFFFFFE, 0xFFFFFFFD
_SECTOR, _MINI = 512, 64


class _Entry:
    """A directory entry of a compound file."""

    def __init__(self, name: str, kind: int, data: bytes = b"") -> None:
        self.name, self.kind, self.data = name, kind, data
        self.children: list[int] = []
        self.left = self.right = self.child = _FREE
        self.start = _LAST


def compound_file(streams: Mapping[tuple[str, ...], bytes]) -> bytes:
    """A compound file (version 3) of streams by path, [MS-CFB]; the storages are implied."""
    entries = _entries(streams)
    sectors: list[bytes] = []
    table: list[int] = []

    def place(data: bytes) -> int:
        count, first = -(-len(data) // _SECTOR), len(sectors)
        for k in range(count):
            sectors.append(data[k * _SECTOR : (k + 1) * _SECTOR].ljust(_SECTOR, b"\0"))
            table.append(first + k + 1 if k < count - 1 else _LAST)
        return first if count else _LAST

    mini = bytearray()
    mini_table: list[int] = []
    for entry in entries:
        if entry.kind != 2 or not entry.data:
            continue
        if len(entry.data) < 4096:
            count, entry.start = -(-len(entry.data) // _MINI), len(mini_table)
            mini_table += [entry.start + k + 1 for k in range(count - 1)] + [_LAST]
            mini += entry.data.ljust(count * _MINI, b"\0")
        else:
            entry.start = place(entry.data)
    entries[0].start, entries[0].data = place(bytes(mini)), bytes(mini)
    packed = b"".join(struct.pack("<I", number) for number in mini_table)
    mini_sectors = -(-len(packed) // _SECTOR)
    mini_start = place(packed.ljust(mini_sectors * _SECTOR, b"\xff"))
    directory_start = place(_packed(entries))
    per_sector = _SECTOR // 4
    count = 1
    while count * per_sector < len(sectors) + count:
        count += 1
    own = [len(sectors) + k for k in range(count)]
    table += [_TABLE] * count
    table += [_FREE] * (count * per_sector - len(table))
    raw = struct.pack(f"<{len(table)}I", *table)
    sectors += [raw[k * _SECTOR : (k + 1) * _SECTOR] for k in range(count)]
    head = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + b"\0" * 16
    head += struct.pack("<HHHHH6x", 0x3E, 3, 0xFFFE, 9, 6)
    head += struct.pack("<IIIII", 0, count, directory_start, 0, 4096)
    head += struct.pack("<IIII", mini_start, mini_sectors, _LAST, 0)
    head += struct.pack("<109I", *own, *([_FREE] * (109 - count)))
    return head + b"".join(sectors)


def _entries(streams: Mapping[tuple[str, ...], bytes]) -> list[_Entry]:
    entries = [_Entry("Root Entry", 5)]
    place: dict[tuple[str, ...], int] = {(): 0}
    for path, data in streams.items():
        for depth in range(1, len(path)):
            if path[:depth] not in place:
                place[path[:depth]] = len(entries)
                entries[place[path[: depth - 1]]].children.append(len(entries))
                entries.append(_Entry(path[depth - 1], 1))
        entries[place[path[:-1]]].children.append(len(entries))
        entries.append(_Entry(path[-1], 2, data))

    def balanced(ordered: list[int]) -> int:
        if not ordered:
            return _FREE
        middle = len(ordered) // 2
        entry = entries[ordered[middle]]
        entry.left, entry.right = balanced(ordered[:middle]), balanced(ordered[middle + 1 :])
        return ordered[middle]

    for entry in entries:
        by_length = sorted(
            entry.children, key=lambda i: (len(entries[i].name), entries[i].name.upper())
        )
        entry.child = balanced(by_length)
    return entries


def _packed(entries: list[_Entry]) -> bytes:
    out = b""
    for entry in entries:
        name = entry.name.encode("utf-16le") + b"\0\0"
        out += name.ljust(64, b"\0")
        out += struct.pack(
            "<HBBIII", len(name), entry.kind, 1, entry.left, entry.right, entry.child
        )
        out += b"\0" * 16 + struct.pack("<IQQIQ", 0, 0, 0, entry.start, len(entry.data))
    while len(out) % _SECTOR:
        out += b"\0" * 64 + struct.pack("<HBBIII", 0, 0, 0, _FREE, _FREE, _FREE) + b"\0" * 36
    return out
