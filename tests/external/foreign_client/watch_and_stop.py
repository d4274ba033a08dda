"""A client of the link that shares no code with it: only the .proto files, ZeroMQ and its own reading of both.

Asks for the status, watches telemetry until it has seen enough, stops the robot, and checks what it can see from
outside: sequence numbers, fetched telemetry equal to what was heard, a repeated stop answered alike.
Prints one line of JSON; exits 0 when all was as it should be, 1 with one line on stderr otherwise.
"""

import argparse
import glob
import json
import os
import sys
import time
import uuid


def arguments():
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--messages", required=True, help="folder with the modules that protoc made")
    parser.add_argument("--host", default="127.0.0.1")
    parser.add_argument("--command-port", type=int, default=7741)
    parser.add_argument("--telemetry-port", type=int, default=7742)
    parser.add_argument("--fetch-port", type=int, default=7743)
    parser.add_argument("--keys", help="folder with NAME.secret, NAME.public and robot.public")
    parser.add_argument("--watch", type=int, default=3, help="pieces of telemetry to see before stopping")
    parser.add_argument("--kind", default="", help="count only this kind: episode, verdict, status or note")
    parser.add_argument("--seconds", type=float, default=30, help="give up after this time")
    return parser.parse_args()


def fail(words):
    print(f"foreign client: {words}", file=sys.stderr)
    sys.exit(1)


class Robot:
    def __init__(self, options):
        self.options = options
        self.context = zmq.Context()
        self.deadline = time.monotonic() + options.seconds

    def socket(self, kind, port):
        socket = self.context.socket(kind)
        socket.linger = 0
        if self.options.keys:
            def key(path):
                with open(path, "rb") as file:
                    return file.read().strip()
            secret = glob.glob(os.path.join(self.options.keys, "*.secret"))
            if len(secret) != 1:
                fail(f"found {len(secret)} secret keys in {self.options.keys}, expected 1")
            socket.curve_secretkey = key(secret[0])
            socket.curve_publickey = key(secret[0][: -len(".secret")] + ".public")
            socket.curve_serverkey = key(os.path.join(self.options.keys, "robot.public"))
        socket.connect(f"tcp://{self.options.host}:{port}")
        return socket

    def left_ms(self):
        return max(0, int(1000 * (self.deadline - time.monotonic())))

    def exchange(self, port, message, answer):
        """REQ here, where our own client uses DEALER: both must be served."""
        socket = self.socket(zmq.REQ, port)
        socket.send(message.SerializeToString())
        if not socket.poll(self.left_ms()):
            fail(f"no answer at port {port}, expected one")
        answer.ParseFromString(socket.recv())
        socket.close()
        return answer

    def command(self, name, identity=None):
        command = link_pb2.Command(format=1, id=identity or uuid.uuid4().hex, operator_name="foreign")
        getattr(command, name).SetInParent()
        return self.exchange(self.options.command_port, command, link_pb2.Answer())

    def fetch(self, first, last):
        wanted = link_pb2.Fetch()
        wanted.telemetry.from_sequence = first
        wanted.telemetry.to_sequence = last
        return self.exchange(self.options.fetch_port, wanted, link_pb2.Fetched())


def watch(robot):
    """As many pieces as wanted of the wanted kind, with all that came between."""
    socket = robot.socket(zmq.SUB, robot.options.telemetry_port)
    socket.subscribe(b"telemetry")
    seen = []
    counted = 0
    while counted < robot.options.watch:
        if not socket.poll(robot.left_ms()):
            fail(f"heard {counted} pieces of telemetry, expected {robot.options.watch}")
        frames = socket.recv_multipart()
        if len(frames) != 2 or frames[0] != b"telemetry":
            fail(f"heard {len(frames)} frames, expected the topic and one Telemetry")
        seen.append(link_pb2.Telemetry.FromString(frames[1]))
        kind = seen[-1].WhichOneof("what")
        counted += 1 if robot.options.kind in ("", kind) else 0
    for before, after in zip(seen, seen[1:]):
        if after.sequence != before.sequence + 1:
            fail(f"heard sequence {after.sequence} after {before.sequence}, expected one more")
    return seen


def main(options):
    robot = Robot(options)
    status = robot.command("ask_status")
    if not status.accepted or not status.HasField("status"):
        fail(f"asked for the status, heard '{status.words}'")
    seen = watch(robot)
    fetched = robot.fetch(seen[0].sequence, seen[-1].sequence)
    if not fetched.ok:
        fail(f"fetched telemetry, heard '{fetched.words}'")
    heard = {one.sequence: one.SerializeToString() for one in seen}
    for one in fetched.telemetry:
        if heard.get(one.sequence) != one.SerializeToString():
            fail(f"fetched telemetry {one.sequence} differs from what was heard")
    identity = uuid.uuid4().hex
    stop = robot.command("stop", identity)
    if not stop.accepted:
        fail(f"stop was refused: {stop.words}")
    if not stop.confirmed:
        fail(f"stop was not confirmed: {stop.words}")
    again = robot.command("stop", identity)
    if not again.repeated or again.words != stop.words:
        fail(f"the same stop again was answered '{again.words}', expected the first answer")
    print(json.dumps({
        "robot": status.status.robot,
        "seen": len(seen),
        "kinds": sorted({one.WhichOneof("what") for one in seen}),
        "fetched": len(fetched.telemetry),
        "stop": stop.words,
    }))


if __name__ == "__main__":
    chosen = arguments()
    sys.path.insert(0, chosen.messages)
    try:
        import zmq
        from pastern.v1 import link_pb2
    except ImportError as error:
        fail(f"{error}: expected Debian's python3-zmq and python3-protobuf, and modules made by protoc")
    main(chosen)
