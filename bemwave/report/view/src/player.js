// Time: play and pause, the slider, the keys. Nothing moves until asked to.

export class Player {
  constructor(root, times, show) {
    this.times = times;
    this.show = show;
    this.button = root.querySelector("[name=play]");
    this.slider = root.querySelector("[name=time]");
    this.told = root.querySelector(".time output");
    this.playing = false;
    this.position = Number(this.slider.value);
    this.button.addEventListener("click", () => this.toggle());
    this.slider.addEventListener("input", () => {
      this.pause();
      this.go(Number(this.slider.value));
    });
    document.addEventListener("keydown", (event) => this.space(event, root));
    this.stills = window.matchMedia("(prefers-reduced-motion: reduce)");
  }

  get last() {
    return this.times.length - 1;
  }

  go(position) {
    this.position = Math.max(0, Math.min(this.last, position));
    this.slider.value = Math.round(this.position);
    const text = `t = ${this.timeAt(this.position).toFixed(2)} s`;
    this.told.textContent = text;
    this.slider.setAttribute("aria-valuetext", text);
    this.show(this.position);
  }

  timeAt(position) {
    const before = Math.floor(position);
    const after = Math.min(before + 1, this.last);
    return this.times[before] + (position - before) * (this.times[after] - this.times[before]);
  }

  toggle() {
    if (this.playing) this.pause();
    else this.play();
  }

  play() {
    if (this.last === 0) return;
    if (this.position >= this.last) this.go(0);
    this.playing = true;
    this.label("Pause");
    this.clock = performance.now();
    requestAnimationFrame((now) => this.tick(now));
  }

  pause() {
    this.playing = false;
    this.label("Play");
  }

  label(text) {
    this.button.querySelector(".word").textContent = text;
    this.button.dataset.state = text;
  }

  // In time with the clock; where less motion is asked for, one still a second.
  tick(now) {
    if (!this.playing) return;
    const passed = (now - this.clock) / 1000;
    if (!this.stills.matches || passed >= 1) {
      this.clock = now;
      const interval = (this.times[this.last] - this.times[0]) / this.last;
      const next = this.position + passed / interval;
      this.go(this.stills.matches ? Math.round(next) : next);
      if (this.position >= this.last) this.pause();
    }
    requestAnimationFrame((later) => this.tick(later));
  }

  key(event) {
    const steps = { ",": -1, ".": 1 };
    if (!(event.key in steps)) return;
    this.pause();
    this.go(Math.round(this.position) + steps[event.key]);
    event.preventDefault();
  }

  // Space works wherever it has no meaning of its own, while the sea is in sight.
  space(event, root) {
    if (event.key !== " " || event.target.closest("button, a, summary, select, textarea")) return;
    const { top, bottom } = root.getBoundingClientRect();
    if (bottom < 0 || top > window.innerHeight) return;
    this.toggle();
    event.preventDefault();
  }
}
