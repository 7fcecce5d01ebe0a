"""The yardstick: the same triangles and lights drawn by Mesa's software rasteriser through OpenGL."""

from __future__ import annotations

import os
import time

import numpy as np

os.environ["LIBGL_ALWAYS_SOFTWARE"] = "1"

_VERTEX = """#version 330
uniform mat4 to_clip; in vec3 p; in vec3 n; in vec3 c; out vec3 place; out vec3 normal; flat out vec3 colour;
void main() { gl_Position = to_clip * vec4(p, 1); place = p; normal = n; colour = c; }"""
_FRAGMENT = """#version 330
in vec3 place; in vec3 normal; flat in vec3 colour; out vec4 result;
uniform vec3 eye; uniform vec3 light[3]; uniform vec3 power[3]; uniform float ambient, specular, shininess;
void main() {
  vec3 n = normalize(normal), v = normalize(eye - place);
  if (dot(n, v) < 0) n = -n;
  vec3 sum = ambient * colour;
  for (int i = 0; i < 3; i++) {
    float d = max(dot(n, light[i]), 0.0);
    float s = pow(max(dot(n, normalize(light[i] + v)), 0.0), shininess);
    sum += power[i] * (colour * d + specular * s * step(1e-6, d));
  }
  result = vec4(sum, 1);
}"""


class Yardstick:
    """One scene on the graphics library: vertices, normals, colours (n,3), faces (m,3), clip matrix (4,4)."""

    def __init__(self, size, samples, vertices, normals, colours, faces, to_clip, eye, lights, powers):
        import moderngl

        self.context = moderngl.create_standalone_context(backend="egl")
        self.name = self.context.info["GL_RENDERER"]
        context, self.samples = self.context, samples
        program = context.program(vertex_shader=_VERTEX, fragment_shader=_FRAGMENT)
        program["to_clip"].write(to_clip.T.astype("f4").tobytes())
        program["eye"].value = tuple(float(v) for v in eye)
        program["light"].write(lights.astype("f4").tobytes())
        program["power"].write(powers.astype("f4").tobytes())
        program["ambient"].value, program["specular"].value, program["shininess"].value = 0.08, 0.35, 32.0
        self.resolved = context.framebuffer([context.renderbuffer(size, 4)], context.depth_renderbuffer(size))
        self.target = self.resolved
        if samples > 1:
            self.target = context.framebuffer(
                [context.renderbuffer(size, 4, samples=samples)], context.depth_renderbuffer(size, samples=samples)
            )
        context.enable(moderngl.DEPTH_TEST)
        context.disable(moderngl.CULL_FACE)
        data = context.buffer(np.hstack([vertices, normals, colours]).astype("f4").tobytes())
        index = context.buffer(faces.astype("i4").tobytes())
        self.array = context.vertex_array(program, [(data, "3f 3f 3f", "p", "n", "c")], index)
        context.finish()

    def frame(self):
        """Draw, resolve and read back; seconds."""
        start = time.perf_counter()
        self.target.use()
        self.target.clear(1, 1, 1, 1, depth=1.0)
        self.array.render()
        if self.samples > 1:
            self.context.copy_framebuffer(self.resolved, self.target)
        self.pixels = self.resolved.read(components=4)
        return time.perf_counter() - start

    def release(self):
        self.context.release()
