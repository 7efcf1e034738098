"""Many bent files through every reader, guided by coverage where atheris is installed.

``python tests/fuzz/campaign.py --inputs 1000000 --record fuzz.json`` runs every reader in a
process of its own. Each input has 10 s and the process 4 GiB. A find (any exception but a
refusal, a refusal that a terminal would obey, a hang, memory) is written beside the record
and ends that reader's share, unless ``--keep-going``.
"""

from __future__ import annotations

import argparse
import hashlib
import json
import os
import random
import resource
import signal
import subprocess
import sys
import tempfile
import time
import traceback
import warnings
from pathlib import Path
from types import FrameType

sys.path.insert(0, str(Path(__file__).parent))
sys.path.insert(1, str(Path(__file__).parents[2]))

SECONDS, BYTES = 10.0, 4 * 2**30
SHARES = {
    "case": 30, "study": 7, "material": 25, "plasma": 80, "oem": 110, "ephemeris table": 110,
    "tle": 120, "plasma timeline": 110, "activity": 110, "spectrum": 90, "attitude": 70,
    "temperature": 70, "shadow": 68,
}  # fmt: skip


class HangError(BaseException):
    """An input took too long."""


def ring(_number: int, _frame: FrameType | None) -> None:
    """Answer of the alarm."""
    raise HangError


class Tally:
    """What came of the inputs of one reader."""

    def __init__(self, kind: str, folder: Path, wanted: int, finds: Path, go_on: bool) -> None:
        from reader_seeds import FIXED, seeds
        from readers_under_test import Gate, readers

        self.kind, self.wanted, self.finds, self.go_on = kind, wanted, finds, go_on
        self.seeds = seeds()[kind]
        self.pool = list(self.seeds)
        self.read = readers(folder, FIXED)[kind]
        self.gate = Gate(kind)
        setattr(self.gate.module, self.gate.name, self.gate)
        self.inputs = self.past = self.accepted = self.found = 0
        self.slowest, self.began = 0.0, time.monotonic()
        self.where: dict[str, int] = {}
        signal.signal(signal.SIGALRM, ring)
        resource.setrlimit(resource.RLIMIT_AS, (BYTES, BYTES))
        self.memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
        for seed in self.seeds:
            self.read(seed.encode())  # a seed must be good
        warnings.simplefilter("error")  # a warning in the terminal is a find too

    def one(self, content: bytes) -> None:
        """Try one input."""
        from readers_under_test import refused

        self.gate.passed = False
        began = time.monotonic()
        signal.setitimer(signal.ITIMER_REAL, SECONDS)
        try:
            if not refused(self.read, content):
                self.accepted += 1
                self.keep(content)
        except (Exception, HangError) as error:
            signal.setitimer(signal.ITIMER_REAL, 0.0)
            self.find(error, content)
        finally:
            signal.setitimer(signal.ITIMER_REAL, 0.0)
        self.slowest = max(self.slowest, time.monotonic() - began)
        self.inputs += 1
        self.past += self.gate.passed

    def keep(self, content: bytes) -> None:
        """Let one accepted file in twenty be bent further, the last fifty of them."""
        if self.accepted % 20 == 0 and len(content) < 20_000:
            self.pool.append(content.decode("utf-8"))
            if len(self.pool) > len(self.seeds) + 50:
                del self.pool[len(self.seeds)]

    def find(self, error: BaseException, content: bytes) -> None:
        """Keep an input that no reader should fall over."""
        last = traceback.extract_tb(error.__traceback__)[-1]
        place = f"{type(error).__name__} {Path(last.filename).name}:{last.lineno}"
        self.found += 1
        self.where[place] = self.where.get(place, 0) + 1
        if self.where[place] == 1:
            stem = hashlib.sha256(content).hexdigest()[:12]
            self.finds.mkdir(parents=True, exist_ok=True)
            (self.finds / f"{self.kind}-{stem}.txt").write_bytes(content)
            print(f"{self.kind}: {place}: {str(error)[:300]}", file=sys.stderr)
            traceback.print_exception(error, limit=-4)
        if not self.go_on:
            self.report()
            os._exit(1)

    def report(self) -> None:
        """Print what came of it as one line of JSON."""
        peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
        row = {
            "reader": self.kind, "inputs": self.inputs, "past_grammar": self.past,
            "accepted": self.accepted, "finds": self.where, "slowest_s": round(self.slowest, 3),
            "memory_grown_MB": (peak - self.memory) // 1024,
            "seconds": round(time.monotonic() - self.began, 1),
        }  # fmt: skip
        print(json.dumps(row), flush=True)


def random_campaign(tally: Tally, seed: int) -> None:
    """Bend seeds, and bent files that were accepted, without guidance."""
    from reader_mutations import bent

    draw = random.Random(f"{tally.kind} {seed}")
    while tally.inputs < tally.wanted:
        text = bent(tally.kind, draw.choice(tally.pool), draw)
        tally.one(text.encode("utf-8", errors="surrogatepass"))
    tally.report()


def guided_campaign(args: argparse.Namespace, folder: Path) -> None:
    """Let libFuzzer choose what is bent further, by the branches a file reaches."""
    import atheris

    with atheris.instrument_imports(include=["charging", "materials", "environments"]):
        tally = Tally(args.reader, folder, args.inputs, args.finds, args.keep_going)
    from reader_mutations import bent

    corpus = folder / "corpus"
    corpus.mkdir()
    for number, text in enumerate(tally.seeds):
        (corpus / str(number)).write_text(text, encoding="utf-8")

    def mutator(data: bytes, most: int, seed: int) -> bytes:
        draw = random.Random(seed)
        try:
            text = data.decode("utf-8")
        except UnicodeDecodeError:
            text = ""
        if not text or draw.random() < 0.5:
            text = draw.choice(tally.pool)
        new = bent(args.reader, text, draw).encode("utf-8", errors="surrogatepass")
        return new if len(new) <= most else data

    def one(data: bytes) -> None:
        if not data or data == b"\n":  # libFuzzer's own first trials
            return
        tally.one(data)
        if tally.inputs >= tally.wanted:
            tally.report()
            os._exit(bool(tally.found))

    arguments = [sys.argv[0], f"-seed={args.seed}", "-max_len=40000", "-len_control=0",
                 "-rss_limit_mb=0", "-verbosity=0", str(corpus)]  # fmt: skip
    atheris.Setup(arguments, one, custom_mutator=mutator)
    atheris.Fuzz()


def share(args: argparse.Namespace) -> None:
    """Run one reader's share in this process."""
    with tempfile.TemporaryDirectory(prefix="fuzz-", dir=args.scratch) as name:
        if args.random:
            tally = Tally(args.reader, Path(name), args.inputs, args.finds, args.keep_going)
            random_campaign(tally, args.seed)
        else:
            guided_campaign(args, Path(name))


def main() -> int:
    """Run all readers, or one, and write the record."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--inputs", type=int, default=1_000_000)
    parser.add_argument("--reader", choices=sorted(SHARES))
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--random", action="store_true", help="without coverage, without atheris")
    parser.add_argument("--keep-going", action="store_true")
    parser.add_argument("--record", type=Path)
    parser.add_argument("--finds", type=Path, default=Path("fuzz_finds"))
    parser.add_argument("--scratch", type=Path, default=None)
    args = parser.parse_args()
    if args.reader:
        share(args)
        return 0
    rows = []
    for kind, part in SHARES.items():
        count = -(-args.inputs * part // sum(SHARES.values()))
        command = [sys.executable, __file__, "--reader", kind, "--inputs", str(count),
                   "--seed", str(args.seed), "--finds", str(args.finds),
                   *(["--random"] if args.random else []),
                   *(["--scratch", str(args.scratch)] if args.scratch else []),
                   *(["--keep-going"] if args.keep_going else [])]  # fmt: skip
        done = subprocess.run(command, stdout=subprocess.PIPE, text=True, check=False)
        lines = [line for line in done.stdout.splitlines() if line.startswith("{")]
        rows.append(json.loads(lines[-1]) if lines else {"reader": kind, "died": done.returncode})
        print(json.dumps(rows[-1]), flush=True)
    total = {
        key: sum(row.get(key, 0) for row in rows) for key in ("inputs", "past_grammar", "accepted")
    }
    print(json.dumps(total))
    if args.record:
        record = {"seed": args.seed, "guided": not args.random, "total": total, "readers": rows}
        args.record.write_text(json.dumps(record, indent=1) + "\n", encoding="utf-8")
    return int(any(row.get("finds") or "died" in row for row in rows))


if __name__ == "__main__":
    sys.exit(main())
