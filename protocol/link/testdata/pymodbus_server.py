"""A pymodbus server on loopback with the tables that the tests know. The port is its argument; prints it when it listens."""
import asyncio
import sys

from pymodbus.datastore import ModbusSequentialDataBlock, ModbusServerContext, ModbusSlaveContext
from pymodbus.server.async_io import ModbusTcpServer
from pymodbus.transaction import ModbusSocketFramer

registers = [(i * 7919 + 13) & 0xFFFF for i in range(200)]
registers[20:22] = [0x47F1, 0x2000]
unit = ModbusSlaveContext(
    co=ModbusSequentialDataBlock(0, [i * i % 7 < 3 for i in range(200)]),
    di=ModbusSequentialDataBlock(0, [i % 3 == 0 for i in range(200)]),
    hr=ModbusSequentialDataBlock(0, registers),
    ir=ModbusSequentialDataBlock(0, [(i * 104729 + 7) & 0xFFFF for i in range(200)]),
    zero_mode=True,
)


async def main():
    context = ModbusServerContext(slaves=unit, single=True)
    server = ModbusTcpServer(context, ModbusSocketFramer, address=("127.0.0.1", int(sys.argv[1])), allow_reuse_address=True)
    serving = asyncio.ensure_future(server.serve_forever())
    await server.serving
    print(sys.argv[1], flush=True)
    await serving


asyncio.run(main())
