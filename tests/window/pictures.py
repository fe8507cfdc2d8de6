#!/usr/bin/env python3
"""Runs the real program in a real window and looks at it.

    pictures.py PROGRAM [--pictures FOLDER] [--renderer auto|glow|cpu]

Starts Xvfb and openbox, opens the window, checks that it is not blank, drags a curve, measures the processor time of
doing nothing, closes with Alt+F4 and expects exit code 0. With --pictures it also keeps four screenshots: 1280x720 and
2560x1440, light and dark. Needs: xvfb openbox xdotool imagemagick.
"""
import argparse, json, os, subprocess, sys, tempfile, time


class Screen:
    """A virtual display with a window manager."""

    def __init__(self, width, height):
        read, write = os.pipe()
        command = ["Xvfb", "-displayfd", str(write), "-screen", "0", f"{width}x{height}x24", "-nolisten", "tcp"]
        self.server = subprocess.Popen(command, pass_fds=[write], stderr=subprocess.DEVNULL)
        os.close(write)
        number = b""
        while not number.endswith(b"\n"):
            chunk = os.read(read, 16)
            if not chunk:
                sys.exit("Xvfb did not start")
            number += chunk
        self.home = tempfile.mkdtemp(prefix="whitesmith-window-")
        self.env = dict(os.environ, DISPLAY=":" + number.decode().strip(), HOME=self.home)
        for name in ("XDG_DATA_HOME", "XDG_STATE_HOME", "XDG_CONFIG_HOME"):
            self.env[name] = os.path.join(self.home, name.lower())
        for name in ("WAYLAND_DISPLAY", "WAYLAND_SOCKET", "DBUS_SESSION_BUS_ADDRESS"):
            self.env.pop(name, None)
        self.manager = subprocess.Popen(["openbox"], env=self.env, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        time.sleep(1.0)

    def xdotool(self, *words):
        done = subprocess.run(["xdotool", *map(str, words)], env=self.env, capture_output=True, text=True)
        return done.stdout.strip()

    def picture(self, window, path):
        subprocess.run(["import", "-window", window, "-define", "png:exclude-chunks=date,time", path], env=self.env, check=True)

    def close(self):
        self.manager.terminate()
        self.server.terminate()
        self.server.wait()


def processor_seconds(pid):
    fields = open(f"/proc/{pid}/stat").read().rsplit(")", 1)[1].split()
    return (int(fields[11]) + int(fields[12])) / os.sysconf("SC_CLK_TCK")


def fail(message, program):
    program.kill()
    sys.exit(f"pictures.py: {message}")


def run(options, width, height, dark, keep):
    # Room for the window manager's frame round the window.
    screen = Screen(width + 40, height + 80)
    log = open(os.path.join(screen.home, "errors"), "w+")
    begun = time.time()
    program = subprocess.Popen([options.program, "--renderer", options.renderer], env=screen.env, stdout=log, stderr=log)
    window = ""
    while not window:
        if program.poll() is not None or time.time() - begun > 60:
            log.seek(0)
            fail(f"no window within 60 s (exit code {program.poll()}): {log.read()}", program)
        found = screen.xdotool("search", "--onlyvisible", "--name", "Whitesmith")
        window = found.split()[-1] if found else ""
        time.sleep(0.05)
    facts = {"size": f"{width}x{height}", "dark": dark, "window_s": round(time.time() - begun, 2)}
    time.sleep(1.5)
    screen.xdotool("windowactivate", "--sync", window)
    screen.xdotool("windowsize", "--sync", window, width, height)
    time.sleep(2.0)
    geometry = dict(line.split("=") for line in screen.xdotool("getwindowgeometry", "--shell", window).splitlines() if "=" in line)
    left, top = int(geometry["X"]), int(geometry["Y"])
    zoom = float(options.zoom or max(1.0, min(width / 1280, height / 720)) ** 0.5 * 20 // 1 / 20)
    if dark:
        screen.xdotool("mousemove", left + int(width - 26 * zoom), top + int(23 * zoom), "click", 1)
        time.sleep(1.0)
    screen.xdotool("mousemove", left + int(width / 2), top + height - 4)
    time.sleep(1.5)
    picture = keep or os.path.join(screen.home, "window.png")
    screen.picture(window, picture)
    seen = subprocess.run(["identify", "-format", "%k %[fx:standard_deviation]", picture], capture_output=True, text=True).stdout.split()
    facts["colours"], facts["spread"] = int(seen[0]), round(float(seen[1]), 4)
    if facts["colours"] < 200 or facts["spread"] < 0.02:
        fail(f"the window is blank: {facts}", program)

    before = processor_seconds(program.pid)
    time.sleep(8)
    facts["idle_percent"] = round((processor_seconds(program.pid) - before) / 8 * 100, 2)
    if facts["idle_percent"] > 0.3:
        fail(f"the idle window works: {facts}", program)

    # Pull the third row's curve up; the window must look different afterwards.
    x, y = left + int(width * 0.18), top + int(height * 0.66)
    screen.xdotool("mousemove", x, y)
    time.sleep(0.3)
    screen.xdotool("mousedown", 1)
    for step in range(1, 25):
        screen.xdotool("mousemove", x, y - step)
        time.sleep(0.02)
    screen.xdotool("mouseup", 1)
    screen.xdotool("mousemove", left + int(width / 2), top + height - 4)
    time.sleep(1.0)
    pulled = os.path.join(screen.home, "pulled.png")
    screen.picture(window, pulled)
    differing = subprocess.run(["compare", "-metric", "AE", picture, pulled, "null:"], capture_output=True, text=True).stderr
    facts["pixels_changed_by_a_pull"] = int(float(differing.split()[0]))
    if facts["pixels_changed_by_a_pull"] < 500:
        fail(f"a pull changed nothing: {facts}", program)

    screen.xdotool("windowactivate", "--sync", window)
    screen.xdotool("key", "--clearmodifiers", "alt+F4")
    try:
        facts["exit_code"] = program.wait(10)
    except subprocess.TimeoutExpired:
        fail("the window does not close", program)
    screen.close()
    print(json.dumps(facts))
    if facts["exit_code"] != 0:
        sys.exit(f"pictures.py: exit code {facts['exit_code']}")


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("program")
    parser.add_argument("--pictures")
    parser.add_argument("--renderer", default="auto")
    parser.add_argument("--zoom", help="scale of the window's text, where it is not the usual one for the size")
    options = parser.parse_args()
    if options.pictures:
        os.makedirs(options.pictures, exist_ok=True)
        for width, height in ((1280, 720), (2560, 1440)):
            for dark in (False, True):
                name = f"mixing-{width}x{height}-{'dark' if dark else 'light'}.png"
                run(options, width, height, dark, os.path.join(options.pictures, name))
    else:
        run(options, 1280, 720, False, None)


main()
