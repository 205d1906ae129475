"""test_examples.py - every example of the manual pages and of the Markdown pages runs as it is written.

An example is a line that begins with `$ ` in a page's section EXAMPLES or in a code block of Markdown; it goes on where
a line ends in `\\` or `|`, within quotes, or until a here-document ends. In Markdown, what follows up to the next one is
its output: each line of it must come, in that order; `...` stands for anything. A block whose first word is `lopside`,
without any `$ `, is all commands.
Each page runs in a folder of its own, see `prepare`; a page of data/ in its copy of that folder.
"""
import os
import pathlib
import re
import shlex
import shutil
import subprocess
import sys
import unittest

import chain

SOURCE = pathlib.Path(__file__).resolve().parents[2]
# These build or install the program, which the suite did before it came here.
BUILDS = re.compile(r"^(sudo |\S*cmake |cpack|ctest|git |apt|scripts/(demo|check|install)|make |crontab )")
WIDE = "-Owidth=400"  # so that no line is folded


def is_open(command):
    """True where the shell would wait for another line."""
    here = re.search(r"<<-?\s*['\"]?(\w+)['\"]?", command)
    if here:
        return here[1] not in command.split("\n")[1:]
    if command.endswith(("\\", "|")):
        return True
    try:
        shlex.split(command)
    except ValueError:
        return True
    return False


def session(lines, prompt="$ "):
    """[(command, [line of output...])...] of one block."""
    lines = [line.rstrip() for line in lines]
    if prompt and not any(line.startswith(prompt) for line in lines):
        first = next((line for line in lines if line), "")
        return session(lines, "") if first.split(" ")[0] == "lopside" else []
    steps = []
    for line in lines:
        if steps and is_open(steps[-1][0]):
            steps[-1] = (steps[-1][0] + "\n" + line, [])
        elif line.startswith(prompt) and line:
            steps.append((line[len(prompt):], []))
        elif steps:
            steps[-1][1].append(line)
    return steps


def manual(page):
    """Examples of a manual page as it is shown. What stands between commands is prose."""
    shown = subprocess.run(["mandoc", "-Tascii", WIDE, page], check=True, capture_output=True, text=True).stdout
    shown = re.sub(".\b", "", shown)
    found = re.search(r"(?ms)^EXAMPLES$\n(.*?)^(?=\S)", shown)
    lines = [line.strip() for line in found[1].splitlines()] if found else []
    if not any(line.startswith("$ ") for line in lines):
        lines = ["$ " + line for line in lines if line.startswith("lopside ")]
    return [(command, []) for command, _ in session(lines)]


def markdown(page):
    """Code blocks: fenced, or indented by four blanks."""
    blocks, block, fenced = [], None, False
    for line in page.read_text().splitlines():
        if line.startswith("```"):
            fenced = not fenced
            if fenced:
                block = []
                blocks.append(block)
            else:
                block = None
        elif fenced:
            block.append(line)
        elif line.startswith("    ") or (block is not None and not line.strip()):
            if block is None:
                block = []
                blocks.append(block)
            block.append(line[4:])
        else:
            block = None
    return blocks


def prepare(top):
    """A job and its streams, under the names that the pages use."""
    fan = chain.DATA / "fan"
    for path in fan.iterdir():
        shutil.copy(path, top)
    shutil.copy(fan / "job.ini", top / "fan.ini")
    shutil.copytree(chain.DATA, top / "data")
    (top / "recordings").mkdir()
    for path in fan.glob("*.wav"):
        shutil.copy(path, top / "recordings")
    shutil.copytree(fan, top / "uploads" / "fan")
    (top / "uploads" / "fan" / "READY").touch()
    data = b""
    for stage, name in (("read", None), ("track", None), ("average", "averaged"), ("vet", "vetted"),
                        ("solve", "solved")):
        data = chain.through([stage], data, read=[top / "job.ini"])
        if name:
            (top / f"{name}.jsonl").write_bytes(data)
    shutil.copy(top / "solved.jsonl", top / "job.jsonl")
    programs = top / ".bin"
    programs.mkdir()
    (programs / "lopside").symlink_to(chain.LOPSIDE)
    (programs / "lopside-inbox").symlink_to(SOURCE / "scripts" / "inbox")
    (programs / "python3").symlink_to(sys.executable)
    (top / "scripts").symlink_to(SOURCE / "scripts")
    return {**os.environ, "PATH": f"{programs}:{os.environ['PATH']}", "LC_ALL": "C.UTF-8"}


def squeezed(text):
    return [" ".join(line.split()) for line in text.splitlines() if line.strip()]


class Examples(unittest.TestCase):
    def follow(self, command, expected, got):
        left = iter(squeezed(got))
        for line in squeezed("\n".join(expected)):
            if line in ("...", "…"):
                continue
            self.assertTrue(any(line == other for other in left), f"{command}\ndoes not give\n{line}\nbut\n{got}")

    def run_page(self, examples, where="."):
        """Runs all examples of a page there; gives their number."""
        examples = [(command, expected) for command, expected in examples if not BUILDS.match(command)]
        with chain.folder() as top:
            env = prepare(top) if examples else {}
            for command, expected in examples:
                self.assertFalse(command.startswith(("cd ", "export ")), f"would not last: {command}")
                done = subprocess.run(["bash", "-o", "pipefail", "-c", command], cwd=top / where, env=env, text=True,
                                      capture_output=True, timeout=120, stdin=subprocess.DEVNULL)
                self.assertEqual(done.returncode, 0, f"{command}\n{done.stderr}")
                self.follow(command, expected, done.stdout + done.stderr)
        return len(examples)

    def test_session(self):
        """What the extractor takes for commands and for output."""
        text = "$ a | \n  b\none\n\n$ c 'x\ny' \\\n  d\n$ cat <<'END'\n'\nEND\ntwo\n..."
        self.assertEqual(session(text.split("\n")),
                         [("a |\n  b", ["one", ""]), ("c 'x\ny' \\\n  d", []), ("cat <<'END'\n'\nEND", ["two", "..."])])
        self.assertEqual(session(["lopside x", "cat y"]), [("lopside x", []), ("cat y", [])])
        self.assertEqual(session(["[job]", "title = lopside"]), [])
        self.follow("x", ["b  c", "...", "e"], "a\nb c\nd\ne\n")
        with self.assertRaises(AssertionError):
            self.follow("x", ["e", "b c"], "a\nb c\nd\ne\n")
        with self.assertRaises(AssertionError):
            self.run_page([("lopside help | grep -q nothing-like-it", [])])

    def test_manual_pages(self):
        pages = sorted((SOURCE / "src").rglob("*.1"))
        self.assertGreater(len(pages), 9)
        for page in pages:
            with self.subTest(page=page.name):
                self.assertGreater(self.run_page(manual(page)), 0, "no example")

    def test_markdown_pages(self):
        pages = [p for p in sorted(SOURCE.rglob("*.md"))
                 if not any(part.startswith((".", "build")) for part in p.relative_to(SOURCE).parts)]
        self.assertIn(SOURCE / "README.md", pages)
        for page in pages:
            with self.subTest(page=page.name):
                count = self.run_page([step for block in markdown(page) for step in session(block)],
                                      page.parent.relative_to(SOURCE))
                if page.name == "README.md" and page.parent == SOURCE:
                    self.assertGreater(count, 2)


if __name__ == "__main__":
    unittest.main()
