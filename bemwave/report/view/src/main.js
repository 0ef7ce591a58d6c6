// The sea of a run, to look at: data from the page's own JSON, nothing from elsewhere.
import { readWater } from "./water.js";
import { Stage } from "./stage.js";
import { Player } from "./player.js";
import { drawScale } from "./scale.js";

async function start() {
  const root = document.getElementById("view");
  if (!root) return; // a run without records has no sea to show
  const water = await readWater(document.getElementById("view-data").textContent);
  const holder = root.querySelector(".stage");
  const context = holder.querySelector("canvas").getContext("webgl2", { antialias: true });
  if (!context) {
    root.querySelector(".missing").hidden = false; // the page's maps show the same water
    return;
  }
  root.classList.add("live"); // now there is room to draw in
  const stage = new Stage(holder, water, context);
  drawScale(root.querySelector(".scale canvas"), water.colours);
  const player = new Player(root, water.times, (position) => stage.show(position));
  stage.canvas.addEventListener("keydown", (event) => player.key(event));
  const exaggeration = root.querySelector("[name=exaggeration]");
  const heights = root.querySelector(".exaggeration output");
  const stretch = () => {
    heights.textContent = `× ${exaggeration.value}`;
    exaggeration.setAttribute("aria-valuetext", `heights times ${exaggeration.value}`);
    stage.exaggerate(Number(exaggeration.value));
  };
  exaggeration.addEventListener("input", stretch);
  root.querySelector("[name=reset]").addEventListener("click", () => stage.reset());
  stretch();
  player.go(player.position);
}

start();
