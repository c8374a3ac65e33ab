// Reading a label with the camera. The button is shown only where the browser reads codes by itself
// and lets a page ask for the camera; the field beside it always takes a code.

import { codeIn } from "../lib/scanned.js";

const EVERY_MS = 150;
const box = document.getElementById("scan");
const buttons = document.querySelectorAll("[data-scan]");

async function canScan() {
  if (!box || !("BarcodeDetector" in window) || !navigator.mediaDevices?.getUserMedia) return false;
  try {
    return (await window.BarcodeDetector.getSupportedFormats()).includes("qr_code");
  } catch {
    return false;
  }
}

async function scan() {
  const video = box.querySelector("video");
  const says = document.getElementById("scan-says");
  let stream = null;
  const stop = () => {
    for (const track of stream?.getTracks() ?? []) track.stop();
    video.srcObject = null;
  };
  box.addEventListener("close", stop, { once: true });
  box.showModal();
  says.textContent = "Looking for a code.";
  try {
    stream = await navigator.mediaDevices.getUserMedia({ video: { facingMode: "environment" } });
  } catch {
    says.textContent = "The camera may not be used here. Close this and type the code from the label.";
    return;
  }
  if (!box.open) return stop();
  video.srcObject = stream;
  video.play().catch(() => {}); // what it shows before it plays is no code
  const detector = new window.BarcodeDetector({ formats: ["qr_code"] });
  while (box.open) {
    for (const found of await detector.detect(video).catch(() => [])) {
      const code = codeIn(found.rawValue);
      if (code) {
        box.close();
        location.assign(`/b/${code}`);
        return;
      }
      says.textContent = "This is a code, but none of a bottle.";
    }
    await new Promise((resolve) => setTimeout(resolve, EVERY_MS));
  }
}

if (await canScan()) {
  for (const button of buttons) {
    button.hidden = false;
    button.addEventListener("click", scan);
  }
}
