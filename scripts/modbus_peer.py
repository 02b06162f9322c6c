#!/usr/bin/env python3
"""A Modbus RTU device by another implementation, to listen to: `pip install 'pymodbus[serial]'`.

Opens a pseudo-terminal, prints its name, and serves device 1 on it until it is stopped or its standard input ends:

    input registers    0, 1   10500 as a signed 32-bit number, high word first: 10.5 at a scale of 0.001
    holding registers  0, 1   10.37 as binary32, high word first
                       2, 3   10.37 as binary32, low word first

A profile for the first: port = the printed name, baud = 19200, frame = "8N1", kind = "modbus-rtu", device = 1,
table = "input", register = 0, type = "i32", word_order = "big", scale = 0.001. `scripts/serial_peers.py` tries all three.
"""

import asyncio
import os
import pty
import struct
import sys
import threading
import tty


def serial_pair():
    """Two pseudo-terminals with a copying thread between them: one for the server, one to be listened to."""
    near, server = pty.openpty()
    far, client = pty.openpty()
    for end in (near, server, far, client):
        tty.setraw(end)

    def copy(source, sink):
        while True:
            os.write(sink, os.read(source, 256))

    for pair in ((near, far), (far, near)):
        threading.Thread(target=copy, args=pair, daemon=True).start()
    return os.ttyname(server), os.ttyname(client)


def end_with_standard_input():
    """Whoever started this is gone when it closes the pipe, however it ended."""
    while sys.stdin.buffer.read(1):
        pass
    os._exit(0)


async def main():
    from pymodbus.datastore import ModbusDeviceContext, ModbusSequentialDataBlock, ModbusServerContext
    from pymodbus.server import StartAsyncSerialServer

    server, client = serial_pair()
    whole = list(struct.unpack(">2H", struct.pack(">i", 10_500)))
    high, low = struct.unpack(">2H", struct.pack(">f", 10.37))
    # The blocks count from 1: register 0 on the line is their first.
    device = ModbusDeviceContext(
        ir=ModbusSequentialDataBlock(1, whole + [0] * 8),
        hr=ModbusSequentialDataBlock(1, [high, low, low, high] + [0] * 8),
    )
    print(client, flush=True)
    if not sys.stdin.isatty():
        threading.Thread(target=end_with_standard_input, daemon=True).start()
    context = ModbusServerContext(devices={1: device}, single=False)
    await StartAsyncSerialServer(context, port=server, baudrate=19_200, parity="N")


if __name__ == "__main__":
    asyncio.run(main())
