// Hulls as they were solved, under water; above it plain walls; boxes and gauges as guides.
import { BoxGeometry, BufferAttribute, BufferGeometry, DoubleSide, EdgesGeometry } from "three";
import { ExtrudeGeometry, Group, LineBasicMaterial, LineLoop, LineSegments, Matrix4, Mesh } from "three";
import { MeshLambertMaterial, ShapePath } from "three";

export function makeHull(body) {
  const group = new Group();
  const wetted = new BufferGeometry();
  wetted.setAttribute("position", new BufferAttribute(body.points, 3));
  wetted.setIndex(new BufferAttribute(body.triangles, 1));
  const flat = wetted.toNonIndexed();
  flat.computeVertexNormals();
  const paint = { side: DoubleSide, flatShading: true };
  group.add(new Mesh(flat, new MeshLambertMaterial({ color: 0x8a3b22, ...paint })));
  const above = new ExtrudeGeometry(outlines(body.waterlines), { depth: body.wall, bevelEnabled: false });
  group.add(new Mesh(above, new MeshLambertMaterial({ color: 0x9aa7ab, ...paint })));
  group.matrixAutoUpdate = false;
  return group;
}

// Waterlines as closed shapes; those that run clockwise are holes in the others.
function outlines(waterlines) {
  const path = new ShapePath();
  for (const line of waterlines) {
    line.forEach(([x, y], k) => (k ? path.lineTo(x, y) : path.moveTo(x, y)));
  }
  return path.toShapes(true);
}

// Where six motions take a hull, at a record or between two; poses are rows of 3 x 4.
export function moveHull(group, poses, position) {
  if (!poses) return;
  const before = Math.min(Math.floor(position), poses.length - 1);
  const after = Math.min(before + 1, poses.length - 1);
  const share = position - before;
  const pose = poses[before].map((value, k) => value + share * (poses[after][k] - value));
  group.matrix.copy(new Matrix4().set(...pose, 0, 0, 0, 1));
  group.matrixWorldNeedsUpdate = true;
}

export function makeBox({ centre, size, angle, bottom, top }) {
  const edges = new EdgesGeometry(new BoxGeometry(size[0], size[1], top - bottom));
  const lines = new LineSegments(edges, new LineBasicMaterial({ color: 0xc8431b }));
  lines.position.set(centre[0], centre[1], (top + bottom) / 2);
  lines.rotation.z = angle;
  return lines;
}

// Where the surface would end at rest.
export function makeRim({ x, y }) {
  const corners = [x[0], y[0], 0, x[1], y[0], 0, x[1], y[1], 0, x[0], y[1], 0];
  const line = new BufferGeometry();
  line.setAttribute("position", new BufferAttribute(new Float32Array(corners), 3));
  return new LineLoop(line, new LineBasicMaterial({ color: 0x7d9299 }));
}

// A gauge: a thin staff from `reach` under still water to as much over it.
export function makeStaff([x, y], reach) {
  const line = new BufferGeometry();
  line.setAttribute("position", new BufferAttribute(new Float32Array([x, y, -reach, x, y, reach]), 3));
  return new LineSegments(line, new LineBasicMaterial({ color: 0xc8431b }));
}
