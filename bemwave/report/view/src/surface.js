// The water's surface: a regular grid whose heights, normals and colours follow the time.
import { BufferAttribute, BufferGeometry, Color, Mesh, MeshLambertMaterial } from "three";
import { DoubleSide, SRGBColorSpace } from "three";

export class Surface {
  constructor(water) {
    this.water = water;
    const count = water.nx * water.ny;
    this.geometry = new BufferGeometry();
    for (const name of ["position", "normal", "color"]) {
      this.geometry.setAttribute(name, new BufferAttribute(new Float32Array(3 * count), 3));
    }
    this.geometry.setIndex(cells(water));
    this.palette = linear(water.colours);
    this.place();
    const material = new MeshLambertMaterial({ vertexColors: true, side: DoubleSide });
    this.mesh = new Mesh(this.geometry, material);
    this.mesh.frustumCulled = false;
  }

  place() {
    const { nx, ny, x, y } = this.water;
    const at = this.geometry.attributes.position;
    for (let j = 0, k = 0; j < ny; j += 1) {
      for (let i = 0; i < nx; i += 1, k += 1) {
        at.setXY(k, x[0] + ((x[1] - x[0]) * i) / (nx - 1), y[0] + ((y[1] - y[0]) * j) / (ny - 1));
      }
    }
  }

  // position: number of a record; between two of them heights are interpolated
  show(position) {
    const { nx, ny, heights, step, limit } = this.water;
    const count = nx * ny;
    const last = heights.length / count - 1;
    const before = Math.min(Math.floor(position), last);
    const after = Math.min(before + 1, last);
    const share = position - before;
    const { position: at, color } = this.geometry.attributes;
    for (let k = 0; k < count; k += 1) {
      const a = heights[before * count + k];
      const b = heights[after * count + k];
      const z = step * (a + share * (b - a));
      at.array[3 * k + 2] = z;
      const tone = Math.max(0, Math.min(255, Math.round(127.5 * (1 + z / limit))));
      color.array.set(this.palette[tone], 3 * k);
    }
    this.turn();
    for (const attribute of Object.values(this.geometry.attributes)) attribute.needsUpdate = true;
  }

  // Normals from the slopes along both rows.
  turn() {
    const { nx, ny, x, y } = this.water;
    const z = this.geometry.attributes.position.array;
    const normal = this.geometry.attributes.normal.array;
    const dx = (x[1] - x[0]) / (nx - 1);
    const dy = (y[1] - y[0]) / (ny - 1);
    for (let j = 0, k = 0; j < ny; j += 1) {
      for (let i = 0; i < nx; i += 1, k += 1) {
        const west = i ? 1 : 0;
        const east = i < nx - 1 ? 1 : 0;
        const south = j ? nx : 0;
        const north = j < ny - 1 ? nx : 0;
        const along = (z[3 * (k + east) + 2] - z[3 * (k - west) + 2]) / (dx * (west + east));
        const across = (z[3 * (k + north) + 2] - z[3 * (k - south) + 2]) / (dy * ((south + north) / nx));
        const size = Math.hypot(along, across, 1);
        normal[3 * k] = -along / size;
        normal[3 * k + 1] = -across / size;
        normal[3 * k + 2] = 1 / size;
      }
    }
  }
}

// Two triangles for each square with a corner in the water; under a hull they stay hidden.
function cells({ nx, ny, shown }) {
  const index = [];
  for (let j = 0; j < ny - 1; j += 1) {
    for (let i = 0; i < nx - 1; i += 1) {
      const k = j * nx + i;
      if (shown[k] && shown[k + 1] && shown[k + nx] && shown[k + nx + 1]) {
        index.push(k, k + 1, k + nx + 1, k, k + nx + 1, k + nx);
      }
    }
  }
  return index;
}

function linear(bytes) {
  const palette = [];
  const color = new Color();
  for (let k = 0; k < bytes.length; k += 3) {
    color.setRGB(bytes[k] / 255, bytes[k + 1] / 255, bytes[k + 2] / 255, SRGBColorSpace);
    palette.push([color.r, color.g, color.b]);
  }
  return palette;
}
