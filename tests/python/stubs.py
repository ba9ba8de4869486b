"""The contract as Python modules, generated into an ignored folder on first use."""

import importlib
import sys
from pathlib import Path

import grpc_tools
from grpc_tools import protoc

ROOT = Path(__file__).resolve().parents[2]
PROTO = ROOT / "proto"
FOLDER = ROOT / "target/python-stubs"


def _generate():
    files = sorted(PROTO.rglob("*.proto"))
    stamp = FOLDER / ".generated"
    if not stamp.exists() or stamp.stat().st_mtime < max(file.stat().st_mtime for file in files):
        FOLDER.mkdir(parents=True, exist_ok=True)
        known = Path(grpc_tools.__file__).parent / "_proto"
        status = protoc.main([
            "protoc", f"-I{PROTO}", f"-I{known}", f"--python_out={FOLDER}", f"--grpc_python_out={FOLDER}",
            *(str(file.relative_to(PROTO)) for file in files),
        ])
        assert status == 0, "the contract does not compile"
        stamp.touch()
    if str(FOLDER) not in sys.path:
        sys.path.insert(0, str(FOLDER))


_generate()


def _module(name):
    return importlib.import_module(f"ropewalk.v1.{name}")


brief = _module("brief_pb2")
diagnosis = _module("diagnosis_pb2")
modes = _module("modes_pb2")
motion = _module("motion_pb2")
motion_result = _module("motion_result_pb2")
service = _module("brief_service_pb2")
service_grpc = _module("brief_service_pb2_grpc")
result = _module("result_pb2")
effect = _module("design_effect_pb2")
finding = _module("finding_pb2")
server = _module("server_service_pb2")
server_grpc = _module("server_service_pb2_grpc")
