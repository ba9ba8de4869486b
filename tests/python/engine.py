"""The engine as a process of its own."""

import json
import os
import subprocess
import threading


class Engine:
    """A running engine on a free port of this machine; a context manager that ends it."""

    def __init__(self, *flags):
        binary = os.environ.get("ROPEWALK_ENGINE_BIN")
        if not binary:
            raise RuntimeError("ROPEWALK_ENGINE_BIN must name the built engine; `tests/run python` sets it")
        self.process = subprocess.Popen(
            [binary, "--listen", "127.0.0.1:0", "--announce", *flags],
            stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
        )
        announced = self.process.stdout.readline()
        if not announced:
            raise RuntimeError(f"the engine did not start: {self.process.stderr.read()}")
        self.address = _address(json.loads(announced))
        # A log that nobody reads would fill its pipe and stop the engine.
        self.log = []
        self.reader = threading.Thread(target=self._read_log, daemon=True)
        self.reader.start()

    def _read_log(self):
        for line in self.process.stderr:
            self.log.append(line)

    def __enter__(self):
        return self

    def __exit__(self, *_):
        self.process.terminate()
        try:
            self.process.wait(timeout=30)
        except subprocess.TimeoutExpired:
            self.process.kill()
            self.process.wait()
            raise
        self.reader.join(timeout=10)
        self.process.stdout.close()
        self.process.stderr.close()


def _address(announced):
    found = [value for value in announced.values() if isinstance(value, str) and value.startswith("127.0.0.1:")]
    assert len(found) == 1, f"one address is announced: {announced}"
    return found[0]
