"""test_install.py - what an installation holds, and that it works from wherever it was put; the Debian package.

LOPSIDE_BUILD is the build folder, CMAKE and CPACK the programs that made it.
"""
import os
import pathlib
import re
import shutil
import subprocess
import tempfile
import unittest

import chain

BUILD = pathlib.Path(os.environ["LOPSIDE_BUILD"])
COMPLETE = r"""
source "$1"; shift
complete -p lopside | grep -q -- '-F _lopside' || exit 9
COMP_WORDS=("$@"); COMP_CWORD=$(($# - 1))
_lopside; printf '%s\n' "${COMPREPLY[@]}"
"""
COMPLETE_ZSH = r"""
_describe() { eval "print -rl -- \${${@[-1]}[@]}"; }
_files() { print -r -- FILES; }
script=$1; shift
words=("$@"); CURRENT=$#
source $script
"""


def run(*args, env=None, cwd=None, code=0, stdin=subprocess.DEVNULL):
    done = subprocess.run([str(a) for a in args], capture_output=True, text=True, env=env, cwd=cwd, timeout=300,
                          stdin=stdin)
    if done.returncode != code:
        raise AssertionError(f"{args} gave {done.returncode}: {done.stdout}{done.stderr}")
    return done.stdout


def stages():
    return re.findall(r"(?m)^  ([a-z]+)  ", run(chain.LOPSIDE, "help"))


class Install(unittest.TestCase):
    @classmethod
    def setUpClass(cls):
        cls.top = pathlib.Path(tempfile.mkdtemp(prefix="lopside-"))
        cls.addClassCleanup(shutil.rmtree, cls.top)
        cls.prefix = cls.top / "a prefix"
        run(os.environ["CMAKE"], "--install", BUILD, "--prefix", cls.prefix)
        # as from cron: nothing of this shell, and the installation is not in PATH
        cls.env = {"PATH": "/usr/bin:/bin", "HOME": str(cls.top)}

    def test_program(self):
        lopside = self.prefix / "bin" / "lopside"
        self.assertEqual(run(lopside, "--version", env=self.env), run(chain.LOPSIDE, "--version"))
        shutil.copytree(chain.DATA / "fan", self.top / "fan")
        got = run(lopside, "balance", "job.ini", env=self.env, cwd=self.top / "fan")
        self.assertEqual(got, run(chain.LOPSIDE, "balance", "job.ini", cwd=chain.DATA / "fan"))
        run(lopside, "check", "job.ini", env=self.env, cwd=self.top / "fan")
        dynamic = run("readelf", "-d", lopside)
        self.assertNotRegex(dynamic, "RPATH|RUNPATH")

    def test_inbox(self):
        job = self.top / "in" / "fan"
        shutil.copytree(chain.DATA / "fan", job)
        (job / "READY").touch()
        said = run(self.prefix / "bin" / "lopside-inbox", self.top / "in", self.top / "out", env=self.env, cwd="/")
        self.assertIn("1 answered", said)
        self.assertEqual((self.top / "out" / "fan" / "report.txt").read_text(),
                         run(chain.LOPSIDE, "balance", "job.ini", cwd=chain.DATA / "fan"))

    def test_manual_pages(self):
        manuals = self.prefix / "share" / "man"
        wanted = ["lopside.1", "lopside-inbox.1", *(f"lopside-{stage}.1" for stage in stages())]
        self.assertGreater(len(wanted), 8)
        for page in wanted:
            text = run("mandoc", "-T", "utf8", manuals / "man1" / page)
            for head in ("NAME", "SYNOPSIS", "EXIT STATUS", "EXAMPLES"):
                self.assertIn(head, re.sub(".\b", "", text), page)
        self.assertTrue((manuals / "man5" / "lopside-sheet.5").exists())

    def bash(self, *words):
        script = self.prefix / "share" / "bash-completion" / "completions" / "lopside"
        return run("bash", "-c", COMPLETE, "bash", script, *words, env=self.env, cwd=self.top).splitlines()

    def zsh(self, *words):
        script = self.prefix / "share" / "zsh" / "site-functions" / "_lopside"
        return run("zsh", "-fc", COMPLETE_ZSH, "zsh", script, *words, env=self.env, cwd=self.top).splitlines()

    def test_completions(self):
        lopside, inbox = self.prefix / "bin" / "lopside", self.prefix / "bin" / "lopside-inbox"
        (self.top / "job.ini").write_text("[run as-found]\n  [ run  second trial ] # x\n")
        self.assertEqual(set(self.bash(lopside, "")), {*stages(), "help", "--help", "--version"})
        self.assertEqual(self.bash(lopside, "so"), ["solve"])
        self.assertEqual(self.bash(lopside, "help", "tr"), ["track"])
        self.assertEqual(set(self.bash(lopside, "balance", "--")),
                         {"--as", "--what", "--output", "--help", "--version"})
        self.assertLess({"text", "csv", "json"}, set(self.bash(lopside, "report", "--as", "")))
        self.assertLess({"readings", "placement"}, set(self.bash(lopside, "report", "--what", "")))
        self.assertEqual(self.bash(lopside, "read", "job.ini", "--run", ""), ["as-found", "second\\ trial"])
        self.assertIn("--longest", self.bash(inbox, "--"))
        self.assertEqual(self.bash(lopside, "read", "jo"), [""])  # left to the shell's file names

        self.assertEqual({line.split(":")[0] for line in self.zsh(lopside, "")},
                         {*stages(), "help", "--help", "--version"})
        self.assertEqual({line.split(":")[0] for line in self.zsh(lopside, "balance", "--")},
                         {"--as", "--what", "--output", "--help", "--version"})
        self.assertLess({"text", "csv", "json"}, set(self.zsh(lopside, "report", "--as", "")))
        self.assertEqual(self.zsh(lopside, "read", "job.ini", "--run", ""), ["as-found", "second trial"])
        self.assertIn("--longest", {line.split(":")[0] for line in self.zsh(inbox, "--")})
        self.assertEqual(self.zsh(lopside, "read", "jo"), ["FILES"])

    def test_package(self):
        out = self.top / "package"
        run(os.environ["CPACK"], "--config", BUILD / "CPackConfig.cmake", "-B", out, cwd=self.top)
        package = next(out.glob("*.deb"))
        depends = run("dpkg-deb", "-f", package, "Depends")
        root = self.top / "root"
        run("dpkg-deb", "-x", package, root)
        program = root / "usr" / "bin" / "lopside"
        self.assertEqual(run(program, "--version", env=self.env), run(chain.LOPSIDE, "--version"))
        # every library that the program names comes with a package that is depended on
        resolved = dict(re.findall(r"(\S+) => (\S+)", run("ldd", program)))
        needed = re.findall(r"\(NEEDED\).*\[(.+)\]", run("readelf", "-d", program))
        self.assertGreater(len(needed), 6)
        for library in needed:
            path = pathlib.Path(resolved[library])
            for candidate in (path, pathlib.Path("/usr") / path.relative_to("/"), path.resolve()):
                owner = subprocess.run(["dpkg", "-S", candidate], capture_output=True, text=True).stdout
                if owner:
                    break
            self.assertIn(owner.split(":")[0], re.findall(r"[^\s,|]+", depends), f"{library} of {owner}")
        for path in ("usr/bin/lopside-inbox", "usr/share/man/man1/lopside.1", "usr/share/doc/lopside/copyright",
                     "usr/share/zsh/vendor-completions/_lopside",
                     "usr/share/bash-completion/completions/lopside-inbox"):
            self.assertTrue((root / path).exists(), path)
        for field in ("Maintainer", "Description", "Section", "Version", "Architecture"):
            self.assertTrue(run("dpkg-deb", "-f", package, field).strip(), field)


if __name__ == "__main__":
    unittest.main()
