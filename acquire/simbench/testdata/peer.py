# A client of the simulated bench that nobody of this project wrote: PyVISA with the pure Python library PyVISA-py.
# In: JSON, the resource strings of scope and supply. Out: JSON, what they said.
import json
import sys

import pyvisa

given = json.load(sys.stdin)
manager = pyvisa.ResourceManager("@py")


def instrument(name, end):
    # A line end after each message and each reply. The client stops reading at the reply's, in a block too.
    return manager.open_resource(given[name], read_termination="\n", write_termination=end, timeout=10000)


said = {}
supply = instrument("supply", "\r\n")
said["supply"] = supply.query("*IDN?")
said["bus_v"] = supply.query_ascii_values("MEASure:VOLTage:DC?")
said["two"] = supply.query("OUTPut?;*OPC?")
supply.write("OUTPut:STATE:NONSENSE 1")
said["refused"] = supply.query("SYSTem:ERRor?")
said["empty"] = supply.query("SYSTem:ERRor?")
supply.timeout = 300
supply.write("*CLS")
try:
    said["silence"] = supply.read()  # a command has no reply
except pyvisa.errors.VisaIOError as e:
    said["silence"] = e.abbreviation
supply.timeout = 10000
said["after_silence"] = supply.query("*OPC?")
supply.close()

scope = instrument("scope", "\n")
said["scope"] = scope.query("*IDN?")
said["ring_hz"] = scope.query_ascii_values("MEASure:FREQuency?")
scope.write("CAPTure")
said["preamble"] = scope.query("CAPTure:PREamble?")
said["uint8"] = scope.query_binary_values("CAPTure:DATA?", datatype="B")
said["after_uint8"] = scope.query("*OPC?")
scope.write("CAPTure:FORMat REAL,32")
said["real"] = scope.query_binary_values("CAPTure:DATA?", datatype="f", is_big_endian=True)
said["after_real"] = scope.query("*OPC?")
scope.write("CAPTure:FORMat INTeger,16;:CAPTure:FORMat:BORDer SWAPped")
said["int16"] = scope.query_binary_values("CAPTure:DATA?", datatype="h", is_big_endian=False)
scope.write("CAPTure:FORMat ASCii")
said["ascii"] = scope.query_ascii_values("CAPTure:DATA?")
said["errors"] = scope.query("SYSTem:ERRor?")
scope.close()

json.dump(said, sys.stdout)
