// Names beside things: plain page text that follows its place in the picture.
import { Vector3 } from "three";

export class Labels {
  constructor(holder, camera) {
    this.layer = holder.querySelector(".labels");
    this.camera = camera;
    this.all = [];
  }

  add(text, place, group, kind) {
    const element = document.createElement("span");
    element.textContent = text; // never markup: names come from the case
    element.className = kind;
    this.layer.append(element);
    this.all.push({ element, place, group });
  }

  follow({ clientWidth, clientHeight }) {
    const at = new Vector3();
    for (const { element, place, group } of this.all) {
      at.copy(place);
      group.updateWorldMatrix(true, false);
      at.applyMatrix4(group.matrixWorld).project(this.camera);
      element.hidden = Math.abs(at.x) > 1 || Math.abs(at.y) > 1 || at.z > 1;
      const [left, top] = [((1 + at.x) / 2) * clientWidth, ((1 - at.y) / 2) * clientHeight];
      element.style.transform = `translate(${left.toFixed(1)}px, ${top.toFixed(1)}px)`;
    }
  }
}
