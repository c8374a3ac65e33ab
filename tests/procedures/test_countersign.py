def test_sheet_whole_way_is_certified(lab):
    import time

    t = time.time()
    a = lab.certify()
    print(a, time.time() - t)
    assert lab.chain().holds
