"""The bench that is a real audio interface: a stream in a child process, read through shared memory.

`bench` is what the program holds; `devices` lists what there is. `process`, `ring`, `lookout`, `gaps` and `marker`
belong to the parent. `child`, `engine`, `synth`, `naming` and `layout` run in the child, which imports numpy and
sounddevice only: nothing here brings PortAudio into the parent, since a dead audio server can hang whoever holds it.
"""
