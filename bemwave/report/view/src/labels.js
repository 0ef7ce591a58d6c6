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

  // The last named stand at their places, the others above these where they would hide one another.
  follow({ clientWidth, clientHeight }) {
    const at = new Vector3();
    const taken = [];
    for (const { element, place, group } of this.all.toReversed()) {
      at.copy(place);
      group.updateWorldMatrix(true, false);
      at.applyMatrix4(group.matrixWorld).project(this.camera);
      element.hidden = Math.abs(at.x) > 1 || Math.abs(at.y) > 1 || at.z > 1;
      if (element.hidden) continue;
      const { offsetLeft, offsetTop, offsetWidth: width, offsetHeight: height } = element;
      const [x, y] = [((1 + at.x) / 2) * clientWidth, ((1 - at.y) / 2) * clientHeight];
      const box = { left: Math.min(x + offsetLeft, clientWidth - width), top: y + offsetTop, width, height };
      for (let other; (other = taken.find((one) => meet(one, box))); ) box.top = other.top - height - 1;
      taken.push(box);
      const [right, down] = [box.left - offsetLeft, box.top - offsetTop];
      element.style.transform = `translate(${right.toFixed(1)}px, ${down.toFixed(1)}px)`;
    }
  }
}

function meet(one, other) {
  const beside = one.left >= other.left + other.width || other.left >= one.left + one.width;
  return !beside && one.top < other.top + other.height && other.top < one.top + one.height;
}
