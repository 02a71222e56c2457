"""The C sources under the address, leak and undefined-behaviour sanitizers, fed by fuzz.c; and free of warnings.

Longer, by hand: SEED and COUNT as environment variables, or fuzz.c as its head says.
"""

import os
import re
from pathlib import Path

import corpus
import pytest
from compilers import KERNEL, SOURCES, compilers, run, zig

from kernel.build import FLAGS

DRIVER = sorted(Path(__file__).parent.glob("*.c"))
SEED, COUNT = int(os.environ.get("SEED", "1")), int(os.environ.get("COUNT", "1500"))
POSIX = "-D_POSIX_C_SOURCE=200809L"
SANITIZED = [
    "-std=c99", "-g", "-O1", "-fno-omit-frame-pointer", "-fsanitize=address,undefined", "-fno-sanitize-recover=all",
    *(f for f in FLAGS if f in ("-ffp-contract=off", "-fno-math-errno")),
    "-Wl,--wrap=malloc,--wrap=calloc", POSIX, f"-I{KERNEL}",
]  # fmt: skip
# A fit of hunger is answered, not fatal: the kernel asks for what a network's header says, terabytes if need be.
QUIET = {"ASAN_OPTIONS": "allocator_may_return_null=1:detect_leaks=1:abort_on_error=1",
         "UBSAN_OPTIONS": "abort_on_error=1:print_stacktrace=1"}  # fmt: skip
STRICT = ["-Wall", "-Wextra", "-Wpedantic", "-Wconversion", "-Wshadow", "-Wno-sign-conversion", "-Werror"]


@pytest.fixture(scope="module")
def fuzz(tmp_path_factory):
    """Runs the driver on the corpus; gives what it prints. Skips where no compiler has the sanitizers."""
    folder = tmp_path_factory.mktemp("fuzz")
    program, file = folder / "fuzz", folder / "corpus"
    probe = folder / "probe.c"
    probe.write_text("int main(void) { return 0; }\n")
    for command in compilers():
        tried = run(*command, "-fsanitize=address,undefined", probe, "-o", program)
        if tried.returncode == 0 and run(program).returncode == 0:
            break
    else:
        assert not os.environ.get("CI"), "CI has to have a C compiler with sanitizers"
        pytest.skip("no C compiler with sanitizers works here")
    built = run(*command, *SANITIZED, *SOURCES, *DRIVER, "-o", program, "-lm")
    assert built.returncode == 0, built.stderr
    corpus.write(file)

    def play(*arguments, **options) -> str:
        done = run(program, file, *arguments, env=os.environ | QUIET | options)
        assert done.returncode == 0, done.stderr[-5000:]
        return done.stdout

    return play


def test_every_network_with_one_thing_wrong_is_refused(fuzz):
    """Too short, too long, an int out of range, no memory; and close profiles, which take small steps of their own."""
    (refused, starved) = map(int, re.findall(r"\d+", fuzz()))
    assert refused > 100_000
    assert starved > 1_000


def test_no_network_and_no_number_does_harm(fuzz):
    """What is asked of each call stands at the head of fuzz.c, the caps on work among it."""
    said = fuzz(SEED, COUNT)
    print(said)
    kept, refused = map(int, re.search(r"kept (\d+), refused (\d+)", said).groups())
    assert min(kept, refused) > COUNT // 4
    calls = [int(n) for n in re.findall(r"^[a-z ,]+: (\d+)$", said.replace("status", "#"), re.MULTILINE)]
    assert len(calls) == 9
    assert min(calls) > COUNT // 10
    ended = {int(s): int(n) for s, n in re.findall(r"^status (\d+): (\d+)$", said, re.MULTILINE)}
    assert ended[0] > COUNT // 2, "most cases are meant to be solved"
    assert sum(n > 0 for n in ended.values()) >= 10, ended


def test_no_answer_depends_on_memory_that_nobody_wrote(fuzz):
    """The same cases with new memory full of one thing and of another: 0x00 and 0xFF, zeros and nans."""
    filled = [fuzz(SEED, 250, ASAN_OPTIONS=f"{QUIET['ASAN_OPTIONS']}:max_malloc_fill_size=1000000000:malloc_fill_byte={b}")
              for b in (0, 255)]  # fmt: skip
    digests = {re.search("digest (.*)", said)[1] for said in filled}
    assert len(digests) == 1


def warnings(folder, command, sources, *flags) -> str:
    strict = ["-std=c99", "-O2", *STRICT, f"-I{KERNEL}", *flags]
    objects = [
        folder / f"{source.stem}.o" for source in sources
    ]  # zig writes beside a null device, not into it
    return "".join(
        run(*command, *strict, "-c", source, "-o", made, cwd=folder).stderr
        for source, made in zip(sources, objects, strict=True)
    )


@pytest.mark.parametrize("command", compilers(), ids=" ".join)
def test_no_warnings(command, tmp_path):
    assert warnings(tmp_path, command, SOURCES) == ""
    assert warnings(tmp_path, command, DRIVER, POSIX) == ""


@pytest.mark.wheels
@pytest.mark.parametrize("target", ["x86_64-linux-gnu.2.17", "x86_64-windows-gnu", "aarch64-macos.11.0"])
def test_no_warnings_for_other_platforms(target, tmp_path):
    assert warnings(tmp_path, zig(), SOURCES, "-target", target) == ""
