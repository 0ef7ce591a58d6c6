// The picture: camera, light, surface, hulls and labels; drawn only when something changed.
import { AmbientLight, DirectionalLight, Group, PerspectiveCamera, Scene } from "three";
import { Vector3, WebGLRenderer } from "three";
import { OrbitControls } from "three/examples/jsm/controls/OrbitControls.js";
import { Labels } from "./labels.js";
import { makeBox, makeHull, makeRim, makeStaff, moveHull } from "./solids.js";
import { Surface } from "./surface.js";

const TURN = Math.PI / 36; // five degrees for each press of a key
const ZOOM = 1.15;
const TILT = (32 * Math.PI) / 180; // of the first view over the water
const ASIDE = (22 * Math.PI) / 180; // to the right of looking along y

export class Stage {
  // context: a WebGL 2 context of the holder's canvas
  constructor(holder, water, context) {
    this.water = water;
    this.canvas = context.canvas;
    this.renderer = new WebGLRenderer({ canvas: this.canvas, context });
    this.renderer.setPixelRatio(Math.min(window.devicePixelRatio, 2));
    this.scene = new Scene();
    this.world = new Group(); // all that heights are exaggerated in
    this.scene.add(this.world);
    this.fill();
    this.camera = new PerspectiveCamera(35, 1, 0.1, 1);
    this.camera.up.set(0, 0, 1);
    this.labels = new Labels(holder, this.camera);
    this.name();
    this.controls = new OrbitControls(this.camera, this.canvas);
    this.controls.maxPolarAngle = Math.PI * 0.62;
    this.canvas.style.touchAction = "pan-y"; // a finger still scrolls the page up and down
    this.controls.addEventListener("change", () => this.draw());
    this.canvas.addEventListener("keydown", (event) => this.key(event));
    new ResizeObserver(() => this.fit()).observe(holder);
    this.reset();
  }

  fill() {
    const { water, world, scene } = this;
    this.surface = new Surface(water);
    const staffs = water.gauges.map(({ place }) => makeStaff(place, 2 * water.limit));
    const things = [this.surface.mesh, makeRim(water)];
    this.hulls = water.bodies.map(makeHull);
    world.add(...things, ...this.hulls, ...water.boxes.map(makeBox), ...staffs);
    const sun = new DirectionalLight(0xffffff, 2.1);
    sun.position.set(-0.6, -0.4, 0.55);
    scene.add(sun, new AmbientLight(0xffffff, 1.5));
  }

  name() {
    const { water, world, labels } = this;
    const [x, y] = [water.x, water.y];
    const lengths = [x[1] - x[0], y[1] - y[0]].map((side) => `${Number(side.toPrecision(3))} m`);
    labels.add(`x → ${lengths[0]}`, new Vector3((x[0] + x[1]) / 2, y[0], 0), world, "edge");
    labels.add(`y → ${lengths[1]}`, new Vector3(x[1], (y[0] + y[1]) / 2, 0), world, "edge");
    for (const { name, label } of water.bodies) {
      labels.add(name, new Vector3(...label), world, "body");
    }
    for (const { name, place } of water.gauges) {
      labels.add(name, new Vector3(place[0], place[1], 2 * water.limit), world, "gauge");
    }
  }

  get reach() {
    const { x, y } = this.water;
    return Math.hypot(x[1] - x[0], y[1] - y[0]);
  }

  reset() {
    const { x, y } = this.water;
    const wide = this.canvas.clientWidth / this.canvas.clientHeight || 1.5;
    const away = this.reach * Math.max(1.25, 1.7 / wide);
    const level = away * Math.cos(TILT);
    this.controls.target.set((x[0] + x[1]) / 2, (y[0] + y[1]) / 2, 0);
    this.camera.position.set(level * Math.sin(ASIDE), -level * Math.cos(ASIDE), away * Math.sin(TILT));
    this.camera.position.add(this.controls.target);
    this.camera.near = this.reach / 500;
    this.camera.far = this.reach * 20;
    this.controls.minDistance = this.reach / 50;
    this.controls.maxDistance = this.reach * 6;
    this.fit();
    this.controls.update();
  }

  fit() {
    const { clientWidth, clientHeight } = this.canvas;
    if (!clientWidth || !clientHeight) return;
    this.renderer.setSize(clientWidth, clientHeight, false);
    this.camera.aspect = clientWidth / clientHeight;
    this.camera.updateProjectionMatrix();
    this.draw();
  }

  show(position) {
    this.surface.show(position);
    this.hulls.forEach((hull, k) => moveHull(hull, this.water.bodies[k].poses, position));
    this.draw();
  }

  exaggerate(times) {
    this.world.scale.z = times;
    this.draw();
  }

  draw() {
    this.renderer.render(this.scene, this.camera);
    this.labels.follow(this.canvas);
  }

  key(event) {
    const turns = { ArrowLeft: [-1, 0], ArrowRight: [1, 0], ArrowUp: [0, -1], ArrowDown: [0, 1] };
    const zooms = { "+": 1 / ZOOM, "=": 1 / ZOOM, "-": ZOOM };
    if (event.ctrlKey || event.altKey || event.metaKey) return;
    if (event.key in turns) this.orbit(...turns[event.key]);
    else if (event.key in zooms) this.approach(zooms[event.key]);
    else if (event.key === "Home") this.reset();
    else return;
    event.preventDefault();
  }

  orbit(sideways, upwards) {
    const { camera, controls } = this;
    const arm = camera.position.clone().sub(controls.target);
    arm.applyAxisAngle(camera.up, sideways * TURN);
    const level = new Vector3().crossVectors(camera.up, arm).normalize();
    const raised = arm.clone().applyAxisAngle(level, upwards * TURN);
    const polar = raised.angleTo(camera.up);
    if (polar > 0.05 && polar < controls.maxPolarAngle) arm.copy(raised);
    camera.position.copy(controls.target).add(arm);
    controls.update();
  }

  approach(factor) {
    const { camera, controls } = this;
    camera.position.sub(controls.target).multiplyScalar(factor).add(controls.target);
    controls.update();
  }
}
