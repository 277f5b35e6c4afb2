"use strict";

// ---- tables: press a title to sort -----------------------------------------------------------
const MONTHS = JSON.parse(document.getElementById("months").textContent);

/** What a cell sorts by: a moment if it tells one, else the number it starts with, else its text. */
function sortKey(text) {
  const day = text.match(/^(\d{1,2}) (\S+) (\d{4})(?:, (\d\d):(\d\d))?/);
  if (day && MONTHS.includes(day[2])) {
    const month = MONTHS.indexOf(day[2]);
    return Date.UTC(day[3], month, day[1], day[4] || 0, day[5] || 0);
  }
  const number = text.match(/^-?[\d,]+(?:\.\d+)?/);
  return number ? Number(number[0].replaceAll(",", "")) : text.toLowerCase();
}

function compare(a, b) {
  if (typeof a === typeof b) return a < b ? -1 : a > b ? 1 : 0;
  return typeof a === "number" ? -1 : 1;
}

for (const table of document.querySelectorAll("table.sorts")) {
  const heads = [...table.tHead.rows[0].cells];
  heads.forEach((head, column) => head.querySelector("button").addEventListener("click", () => {
    const down = head.getAttribute("aria-sort") === "ascending";
    heads.forEach((other) => other.removeAttribute("aria-sort"));
    head.setAttribute("aria-sort", down ? "descending" : "ascending");
    const body = table.tBodies[0];
    const rows = [...body.rows].map((row) => [sortKey(row.cells[column].textContent.trim()), row]);
    rows.sort((a, b) => (down ? -1 : 1) * compare(a[0], b[0]));
    body.append(...rows.map(([, row]) => row));
  }));
}

// ---- the model: drag to turn -----------------------------------------------------------------
/** Read the packed model: a line of JSON, corners as 16-bit steps, one colour number a shape. */
async function unpack(text) {
  const bytes = Uint8Array.from(atob(text), (c) => c.charCodeAt(0));
  const stream = new Blob([bytes]).stream().pipeThrough(new DecompressionStream("deflate"));
  const data = new Uint8Array(await new Response(stream).arrayBuffer());
  const end = data.indexOf(10);
  const head = JSON.parse(new TextDecoder().decode(data.subarray(0, end)));
  const corners = { quads: 4, triangles: 3, lines: 2 };
  const total = head.parts.reduce((sum, part) => sum + part.count * corners[part.kind], 0);
  const steps = new Uint16Array(data.buffer, end + 1, 3 * total);
  const colours = data.subarray(end + 1 + 6 * total);
  const palette = head.palette.map((hex) => parseInt(hex.slice(1), 16));
  const out = { head, faces: { xyz: [], rgb: [] }, lines: { xyz: [], rgb: [] } };
  const order = { quads: [0, 1, 2, 0, 2, 3], triangles: [0, 1, 2], lines: [0, 1] };
  let corner = 0, shape = 0;
  for (const part of head.parts) {
    const into = part.kind === "lines" ? out.lines : out.faces;
    for (let k = 0; k < part.count; k++, shape++, corner += corners[part.kind]) {
      const colour = part.kind === "lines" ? 0x333333 : palette[colours[shape]];
      for (const i of order[part.kind]) {
        for (let axis = 0; axis < 3; axis++) into.xyz.push(steps[3 * (corner + i) + axis] * head.step);
        into.rgb.push(colour >> 16, (colour >> 8) & 255, colour & 255);
      }
    }
  }
  return out;
}

const VERTEX = `attribute vec3 place; attribute vec3 tint; uniform mat4 view; varying vec3 colour;
void main() { gl_Position = view * vec4(place, 1.0); colour = tint; }`;
const FRAGMENT = `precision mediump float; varying vec3 colour;
void main() { gl_FragColor = vec4(colour, 1.0); }`;

function program(gl) {
  const made = gl.createProgram();
  for (const [kind, source] of [[gl.VERTEX_SHADER, VERTEX], [gl.FRAGMENT_SHADER, FRAGMENT]]) {
    const shader = gl.createShader(kind);
    gl.shaderSource(shader, source);
    gl.compileShader(shader);
    gl.attachShader(made, shader);
  }
  gl.linkProgram(made);
  gl.useProgram(made);
  return made;
}

/** Turn, move and perspective in one matrix, column by column; z is up. */
function viewMatrix(eye, aspect) {
  const [sy, cy, sp, cp] = [Math.sin(eye.yaw), Math.cos(eye.yaw), Math.sin(eye.pitch), Math.cos(eye.pitch)];
  const right = [cy, sy, 0], ahead = [-sy * cp, cy * cp, -sp], up = [-sy * sp, cy * sp, cp];
  const dot = (a, b) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
  const near = 0.01 * eye.far, far = 20 * eye.far, f = 1 / Math.tan(0.33);
  const depth = eye.distance - dot(ahead, eye.focus);
  const row = [right.map((x) => x * f / aspect), up.map((x) => x * f),
    ahead.map((x) => x * (far + near) / (far - near)), ahead];
  const shift = [-dot(right, eye.focus) * f / aspect, -dot(up, eye.focus) * f,
    depth * (far + near) / (far - near) - 2 * far * near / (far - near), depth];
  const matrix = new Float32Array(16);
  for (let i = 0; i < 4; i++) {
    for (let j = 0; j < 3; j++) matrix[4 * j + i] = row[i][j];
    matrix[12 + i] = shift[i];
  }
  return matrix;
}

async function showModel(canvas) {
  const gl = canvas.getContext("webgl", { antialias: true, preserveDrawingBuffer: true });
  if (!gl || typeof DecompressionStream === "undefined") {
    canvas.hidden = true;
    document.getElementById("no-3d").hidden = false;
    return;
  }
  const model = await unpack(document.getElementById("model").textContent.trim());
  const made = program(gl);
  const sets = [[gl.TRIANGLES, model.faces], [gl.LINES, model.lines]].map(([mode, set]) => {
    const place = gl.createBuffer(), tint = gl.createBuffer();
    gl.bindBuffer(gl.ARRAY_BUFFER, place);
    gl.bufferData(gl.ARRAY_BUFFER, new Float32Array(set.xyz), gl.STATIC_DRAW);
    gl.bindBuffer(gl.ARRAY_BUFFER, tint);
    gl.bufferData(gl.ARRAY_BUFFER, new Uint8Array(set.rgb), gl.STATIC_DRAW);
    return { mode, place, tint, count: set.xyz.length / 3 };
  });
  const { focus, reach } = model.head;
  const eye = { yaw: 0.6, pitch: 0.55, distance: reach, far: reach, focus: [...focus] };
  const where = (name) => gl.getAttribLocation(made, name);

  function draw() {
    const dots = window.devicePixelRatio || 1;
    canvas.width = canvas.clientWidth * dots;
    canvas.height = canvas.clientHeight * dots;
    gl.viewport(0, 0, canvas.width, canvas.height);
    gl.clearColor(1, 1, 1, 1);
    gl.clear(gl.COLOR_BUFFER_BIT | gl.DEPTH_BUFFER_BIT);
    gl.enable(gl.DEPTH_TEST);
    gl.enable(gl.POLYGON_OFFSET_FILL);
    gl.polygonOffset(1, 1);
    const matrix = viewMatrix(eye, canvas.width / canvas.height);
    gl.uniformMatrix4fv(gl.getUniformLocation(made, "view"), false, matrix);
    for (const set of sets) {
      for (const [name, buffer, kind, even] of [["place", set.place, gl.FLOAT, false],
        ["tint", set.tint, gl.UNSIGNED_BYTE, true]]) {
        gl.bindBuffer(gl.ARRAY_BUFFER, buffer);
        gl.enableVertexAttribArray(where(name));
        gl.vertexAttribPointer(where(name), 3, kind, even, 0, 0);
      }
      gl.drawArrays(set.mode, 0, set.count);
    }
  }

  function turn(dx, dy) {
    eye.yaw -= 0.006 * dx;
    eye.pitch = Math.min(1.55, Math.max(-0.2, eye.pitch + 0.006 * dy));
    draw();
  }

  function move(dx, dy) {
    const k = 0.0014 * eye.distance, s = Math.sin(eye.yaw), c = Math.cos(eye.yaw);
    eye.focus[0] += k * (-c * dx - s * dy);
    eye.focus[1] += k * (-s * dx + c * dy);
    draw();
  }

  function nearer(factor) {
    eye.distance = Math.min(8 * reach, Math.max(0.03 * reach, eye.distance * factor));
    draw();
  }

  canvas.addEventListener("pointermove", (event) => {
    if (!event.buttons) return;
    const by = event.shiftKey || event.buttons & 2 ? move : turn;
    by(event.movementX, event.movementY);
  });
  canvas.addEventListener("pointerdown", (event) => canvas.setPointerCapture(event.pointerId));
  canvas.addEventListener("contextmenu", (event) => event.preventDefault());
  canvas.addEventListener("wheel", (event) => {
    event.preventDefault();
    nearer(Math.exp(0.001 * event.deltaY));
  }, { passive: false });
  canvas.addEventListener("keydown", (event) => {
    const act = { ArrowLeft: () => turn(-20, 0), ArrowRight: () => turn(20, 0), ArrowUp: () => turn(0, -20),
      ArrowDown: () => turn(0, 20), "+": () => nearer(0.9), "-": () => nearer(1.1) }[event.key];
    if (act) { event.preventDefault(); act(); }
  });
  new ResizeObserver(draw).observe(canvas);
  canvas.dataset.ready = "yes";
}

const canvas = document.getElementById("view");
if (canvas) showModel(canvas);
