"use strict";

/* Keys, wheel, mouse and fingers on the canvas, turned into moves and zooms of the view. */
class Input {
  static ARROWS = { ArrowLeft: [-1, 0], ArrowRight: [1, 0], ArrowDown: [0, -1], ArrowUp: [0, 1] };
  static KEY_STEPS = STEPS_PER_LEVEL / 2; // + and − go half a level
  static WHEEL_STEPS = STEPS_PER_LEVEL / 4; // as do two notches of a wheel

  /** `view` has move, zoom, hover, far (pixels of an arrow key) and the actions by key. */
  constructor(canvas, view) {
    this.canvas = canvas;
    this.view = view;
    this.turned = 0; // part of a zoom step left over from the wheel
    this.fingers = new Map(); // pointers that are down, [x, y] each
    this.pinch = null; // {distance, steps} since the second finger came down
    addEventListener("keydown", (event) => this.onKey(event));
    canvas.addEventListener("wheel", (event) => this.onWheel(event), { passive: false });
    canvas.addEventListener("pointerdown", (event) => this.onDown(event));
    canvas.addEventListener("pointermove", (event) => this.onMove(event));
    canvas.addEventListener("pointerup", (event) => this.onUp(event));
    canvas.addEventListener("pointercancel", (event) => this.onUp(event));
    canvas.addEventListener("pointerleave", () => view.hover(null));
  }

  /** Axes that a zoom applies to: those chosen on the page, unless a modifier key says otherwise. */
  static zoomed(event = {}) {
    const chosen = document.querySelector("input[name=axes]:checked").value;
    const which = event.altKey ? "up" : event.shiftKey ? "across" : chosen;
    return { across: which !== "up", up: which !== "across" };
  }

  static choose(axes) {
    document.querySelector(`input[name=axes][value=${axes}]`).checked = true;
  }

  onKey(event) {
    const choosing = event.target.matches("input") && event.key in Input.ARROWS; // arrows choose among its buttons
    const listing = event.target.matches("select"); // letters and arrows choose in its list
    const reading = event.target.id === "legend" && event.key in Input.ARROWS; // arrows scroll it
    if (choosing || listing || reading || event.target.closest("dialog") || event.ctrlKey || event.metaKey) return;
    const action = this.actionOf(event);
    if (!action) return;
    event.preventDefault();
    action();
  }

  actionOf(event) {
    const { view } = this;
    const arrow = Input.ARROWS[event.key];
    const far = event.shiftKey ? 1 : view.far();
    if (arrow) return () => view.move(arrow[0] * far, arrow[1] * far);
    const axes = Input.zoomed({ altKey: event.altKey }); // + itself may need Shift
    if (event.key === "+" || event.key === "=") return () => view.zoom(Input.KEY_STEPS, axes);
    if (event.key === "-") return () => view.zoom(-Input.KEY_STEPS, axes);
    return event.altKey ? undefined : view.actions[event.key.length === 1 ? event.key.toLowerCase() : event.key];
  }

  /** Canvas position of an event in device pixels. */
  position(event) {
    const box = this.canvas.getBoundingClientRect();
    const scale = this.canvas.width / box.width;
    return [(event.clientX - box.left) * scale, (event.clientY - box.top) * scale];
  }

  onWheel(event) {
    event.preventDefault();
    const length = [1, 33, 100][event.deltaMode]; // deltas come in pixels, lines or pages
    const pinch = event.ctrlKey ? 6 : 1; // a pinch on a touch pad arrives as a small turn with Ctrl
    this.turned -= ((event.deltaY || event.deltaX) * length * pinch * Input.WHEEL_STEPS) / 100;
    const steps = Math.trunc(this.turned);
    this.turned -= steps;
    if (steps) this.view.zoom(steps, Input.zoomed(event), ...this.position(event).map(Math.floor));
  }

  onDown(event) {
    if (event.button > 0) return;
    this.canvas.focus({ preventScroll: true });
    this.canvas.setPointerCapture(event.pointerId);
    this.canvas.classList.add("held");
    this.fingers.set(event.pointerId, this.position(event));
    this.pinch = this.fingers.size === 2 ? { distance: this.spread().distance, steps: 0 } : null;
    this.view.hover(this.position(event));
  }

  onMove(event) {
    const at = this.position(event);
    const before = this.fingers.get(event.pointerId);
    this.view.hover(at);
    if (!before || this.fingers.size > 2) return;
    const spread = this.pinch && this.spread();
    this.fingers.set(event.pointerId, at);
    if (this.pinch) return this.followPinch(spread, this.spread());
    const [right, down] = at.map((value, k) => Math.round(value) - Math.round(before[k]));
    if (right || down) this.view.move(-right, down);
  }

  onUp(event) {
    this.fingers.delete(event.pointerId);
    this.pinch = null;
    if (!this.fingers.size) this.canvas.classList.remove("held");
    if (event.pointerType === "touch" && this.fingers.size === 0) this.view.hover(this.position(event));
  }

  /** Middle and distance of the two fingers. */
  spread() {
    const [[x, y], [v, w]] = [...this.fingers.values()];
    return { x: Math.round((x + v) / 2), y: Math.round((y + w) / 2), distance: Math.max(1, Math.hypot(x - v, y - w)) };
  }

  followPinch(before, after) {
    const steps = Math.round(STEPS_PER_LEVEL * Math.log2(after.distance / this.pinch.distance));
    this.view.move(before.x - after.x, after.y - before.y);
    this.view.zoom(steps - this.pinch.steps, Input.zoomed(), after.x, after.y);
    this.pinch.steps = steps;
  }
}
