"""The GUM's arithmetic and the physics of weighing and measuring volume; knows no chemistry."""
